// For the test of the test: it fails with the line, but for a reason of its own.
int number() {
#ifdef OFFENDING
  return unknown_name;
#else
  return 1;
#endif
}
