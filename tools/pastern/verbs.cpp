// Reads tools/verbs/verbs.def.
#include "tools/pastern/verb.h"

namespace pastern::tools {

#define PASTERN_VERB(name) std::unique_ptr<Verb> make_##name();
#include "tools/verbs/verbs.def"
#undef PASTERN_VERB

std::vector<std::unique_ptr<Verb>> all_verbs() {
  std::vector<std::unique_ptr<Verb>> verbs;
#define PASTERN_VERB(name) verbs.push_back(make_##name());
#include "tools/verbs/verbs.def"
#undef PASTERN_VERB
  return verbs;
}

}  // namespace pastern::tools
