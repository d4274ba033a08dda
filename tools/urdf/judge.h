// Judges what a URDF document says, and lays its links out as bodies: links that no moving joint carries are
// merged.
#pragma once

#include "tools/urdf/document.h"

namespace pastern::tools {

enum class JointKind { hinge, turning, sliding, fixed, other };  // turning: a hinge without end stops
[[nodiscard]] JointKind kind_of(const JointSaid& joint);

struct UrdfLayout {
  int root{-1};                  ///< index of the link
  std::vector<int> order;        ///< joints, parents first, else in the file's order
  std::vector<int> parent_link;  ///< of each joint
  std::vector<int> child_link;
};

/// Nothing when the links are no tree, and the rest of the judgement is made all the same.
[[nodiscard]] std::optional<UrdfLayout> judge_document(const UrdfDocument& document, const std::string& path,
                                                       files::Defects& defects);

}  // namespace pastern::tools
