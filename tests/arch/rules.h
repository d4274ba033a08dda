// The rules of the architecture, each a function from a tree to findings of one line; none found: empty.
#pragma once

#include <set>
#include <string>
#include <vector>

#include "tests/arch/tree.h"

namespace pastern::arch {

using Findings = std::vector<std::string>;

/// A line of layers.txt: "folder -> folder : reason".
struct Arrow {
  std::string from;
  std::string to;
  std::string reason;
  int line{0};
};

struct Layers {
  std::vector<Arrow> arrows;
  std::set<std::string> folders;  ///< every folder that an arrow names
  Findings findings;  ///< lines that are not arrows, arrows said twice, without a reason, or in a circle
};
[[nodiscard]] Layers read_layers(const std::string& text);

/// The folder that a path belongs to: the longest that is a prefix; empty when there is none.
[[nodiscard]] std::string folder_of(const Layers& layers, const std::string& path);

/// Only the names of the project at the top, and whatever begins with a dot.
[[nodiscard]] Findings check_top_level(const Tree& tree);
/// Every source in a folder that layers.txt knows (tests/ apart); every quoted include an existing file from
/// the root, in the own folder or along an arrow.
[[nodiscard]] Findings check_includes(const Tree& tree, const Layers& layers);
/// Every arrow is used by an include line.
[[nodiscard]] Findings check_arrows_used(const Tree& tree, const Layers& layers);
/// safety/ includes the C++ standard library and nothing else from outside.
[[nodiscard]] Findings check_safety_is_standard(const Tree& tree);
/// What goes on the robot includes no library that is not allowed there.
[[nodiscard]] Findings check_onboard_libraries(const Tree& tree);
/// Code and list files of runtime/, safety/ and proto/ name neither hal_stub nor tools.
[[nodiscard]] Findings check_nothing_below_sees_above(const Tree& tree);
/// Exactly one file outside hal_stub/ and tests/ includes the C table of drives or loads a shared object.
[[nodiscard]] Findings check_one_caller_of_the_table(const Tree& tree);
/// A DriveCommand is made in safety/gate*.cpp only; its one friend is the gate.
[[nodiscard]] Findings check_drive_command(const Tree& tree);
/// Every .cpp and .c is named by the compile commands; those of tests/must_not_compile by their list file.
[[nodiscard]] Findings check_everything_is_compiled(const Tree& tree, const std::string& compile_commands);

}  // namespace pastern::arch
