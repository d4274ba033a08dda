// For the test of the test: the line is not offending at all.
int number() {
#ifdef OFFENDING
  return 2;
#else
  return 1;
#endif
}
