// The ground command.
#include "tools/pastern/verb.h"

int main(int argc, char** argv) { return pastern::tools::run_command({argv + 1, argv + argc}); }
