// What the XML of a URDF file says about links and joints, before anything is made of it. urdfdom stops at
// the first fault and takes masses and inertias that no body has, so the judgement needs the document itself.
#pragma once

#include <array>
#include <optional>
#include <string>
#include <vector>

#include "proto/files/defect.h"

namespace pastern::tools {

struct LinkSaid {
  std::string name;
  int line{0};
  bool has_inertial{false};
  bool has_shape{false};                         ///< a visual or collision element
  std::optional<double> mass;                    ///< kg
  std::optional<std::array<double, 6>> inertia;  ///< xx, yy, zz, xy, xz, yz about the centre of mass
};

struct JointSaid {
  std::string name;
  int line{0};
  std::string type;
  std::string parent;  ///< links
  std::string child;
  bool mimic{false};
  std::optional<std::array<double, 3>> axis;
  bool has_limit{false};
  std::optional<double> lower, upper, effort, velocity;
  std::optional<double> damping, friction;
};

struct UrdfDocument {
  std::string name;
  std::vector<LinkSaid> links;
  std::vector<JointSaid> joints;
};

/// Nothing when it is no URDF document at all; a figure that is no number is a defect of its own.
[[nodiscard]] std::optional<UrdfDocument> read_document(const std::string& text, const std::string& path,
                                                        files::Defects& defects);

/// A name as it may stand in a line: short, printable.
[[nodiscard]] std::string shown_name(const std::string& name);
/// "link thigh (line 12)"
[[nodiscard]] std::string field_of(const LinkSaid& link);
[[nodiscard]] std::string field_of(const JointSaid& joint);

}  // namespace pastern::tools
