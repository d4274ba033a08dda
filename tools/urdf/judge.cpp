#include "tools/urdf/judge.h"

#include <algorithm>
#include <cmath>
#include <cstdio>
#include <map>

#include "proto/files/words.h"

namespace pastern::tools {
namespace {

using files::shown_number;

constexpr int kFewestJoints = 2;
constexpr int kMostJoints = 32;

/// For sums, which do not come out even.
std::string six_digits(double value) {
  std::array<char, 32> text{};
  (void)std::snprintf(text.data(), text.size(), "%.6g", value);
  return text.data();
}

// One line a defect; every judgement is written so that NaN is refused.
class Judge {
 public:
  Judge(const UrdfDocument& document, const std::string& path, files::Defects& defects)
      : said_(document), path_(path), defects_(defects) {}

  std::optional<UrdfLayout> run() {
    if (said_.name.empty()) add("robot", "no name", "a name");
    names();
    for (const LinkSaid& link : said_.links) inertial(link);
    int moving = 0;
    for (const JointSaid& joint : said_.joints) {
      one(joint);
      moving += kind_of(joint) == JointKind::fixed ? 0 : 1;
    }
    if (said_.links.empty()) {
      add("robot", "no links", "a trunk and the links of its legs");
      return std::nullopt;
    }
    if (moving < kFewestJoints || moving > kMostJoints) {
      add("robot", std::to_string(moving) + " joints that move", "2 to 32");
    }
    std::optional<UrdfLayout> layout = tree();
    if (layout) bodies(*layout);
    return layout;
  }

 private:
  void add(const std::string& field, const std::string& found, const std::string& expected) {
    defects_.push_back({path_, field, found, expected});
  }

  void names() {
    for (std::size_t i = 0; i < said_.links.size(); ++i) {
      const LinkSaid& link = said_.links[i];
      if (link.name.empty()) continue;
      if (!link_.emplace(link.name, static_cast<int>(i)).second) {
        add(field_of(link), "a link of this name before", "a name that no other link has");
      }
    }
    std::map<std::string, int> joints;
    for (const JointSaid& joint : said_.joints) {
      if (joint.name.empty()) continue;
      if (!joints.emplace(joint.name, 0).second) {
        add(field_of(joint), "a joint of this name before", "a name that no other joint has");
      }
    }
  }

  void inertial(const LinkSaid& link) {
    const std::string field = field_of(link);
    if (link.mass && !(*link.mass > 0)) add(field + " mass", shown_number(*link.mass), "a mass above 0 (kg)");
    if (!link.inertia) return;
    const auto& i = *link.inertia;
    if (std::all_of(i.begin(), i.end(), [](double m) { return m == 0; })) {
      add(field + " inertia", "all zero", "moments above 0 (kg m2)");
      return;
    }
    for (std::size_t k = 0; k < 3; ++k) {
      const std::array<const char*, 3> names{"ixx", "iyy", "izz"};
      if (i[k] > 0) continue;
      add(field + " inertia " + names[k], shown_number(i[k]), "a moment above 0 (kg m2)");
      return;
    }
    possible(i, field + " inertia");
  }

  /// Second moments of a body, J = tr(I)/2 1 - I, are positive semi-definite: all principal minors at least
  /// zero. For the diagonal that is the triangle inequality of the moments; with it I itself is positive.
  void possible(const std::array<double, 6>& i, const std::string& field) {
    const double half = (i[0] + i[1] + i[2]) / 2;
    const double slack = 1e-9 * half;  // as in a robot file
    const double most = std::max({i[0], i[1], i[2]});
    if (!(most <= half + slack)) {
      add(field,
          "a moment of " + shown_number(most) + ", the other two together " + six_digits(2 * half - most),
          "each of ixx, iyy, izz at most the sum of the other two");
      return;
    }
    const double a = half - i[0];
    const double b = half - i[1];
    const double c = half - i[2];
    const double minor = std::min({a * b - i[3] * i[3], a * c - i[4] * i[4], b * c - i[5] * i[5]});
    // J has -I's products off its diagonal.
    const double det =
        a * b * c - 2 * i[3] * i[4] * i[5] - a * i[5] * i[5] - b * i[4] * i[4] - c * i[3] * i[3];
    if (!(minor >= -slack * half && det >= -slack * half * half)) {
      add(field, "products ixy, ixz, iyz too large for the moments",
          "moments and products that a body can have");
      return;
    }
    const double full = i[0] * i[1] * i[2] + 2 * i[3] * i[4] * i[5] - i[0] * i[5] * i[5] -
                        i[1] * i[4] * i[4] - i[2] * i[3] * i[3];
    if (!(full > slack * half * half)) {
      add(field, "no moment about one direction", "a positive definite matrix: a body with some thickness");
    }
  }

  void one(const JointSaid& joint) {
    const std::string field = field_of(joint);
    const JointKind kind = kind_of(joint);
    if (kind == JointKind::other) {
      add(field + " type", joint.type.empty() ? "nothing" : shown_name(joint.type),
          "revolute, continuous, prismatic or fixed");
    }
    if (joint.mimic) add(field + " mimic", "a joint that follows another", "joints with a drive each");
    ends(joint, field);
    if (kind == JointKind::fixed || kind == JointKind::other) return;
    if (joint.axis) {
      const auto& a = *joint.axis;
      const double length = std::sqrt(a[0] * a[0] + a[1] * a[1] + a[2] * a[2]);
      if (!(length > 1e-9 && length < 1e9)) {
        add(field + " axis", "length " + shown_number(length), "a direction");
      }
    }
    limits(joint, field, kind);
  }

  void ends(const JointSaid& joint, const std::string& field) {
    const auto check = [&](const std::string& link, const char* end) {
      if (link_.count(link) != 0) return;
      add(field + " " + end, link.empty() ? "nothing" : shown_name(link), "the name of a link");
    };
    check(joint.parent, "parent");
    check(joint.child, "child");
  }

  void limits(const JointSaid& joint, const std::string& field, JointKind kind) {
    if (!joint.has_limit) {
      // A joint that turns on and on may leave it out: effort and velocity are then still missing.
      if (kind != JointKind::turning) {
        add(field + " limit", "nothing", "lower, upper, effort and velocity");
      }
      return;
    }
    if (kind != JointKind::turning) {
      const double lower = joint.lower.value_or(0);
      const double upper = joint.upper.value_or(0);
      if (!(lower < upper)) {
        add(field + " limit", "lower " + shown_number(lower) + ", upper " + shown_number(upper),
            "lower below upper");
      }
    }
    above_zero(joint.effort, field + " limit effort");
    above_zero(joint.velocity, field + " limit velocity");
  }

  void above_zero(const std::optional<double>& figure, const std::string& field) {
    if (figure && *figure > 0) return;
    add(field, figure ? shown_number(*figure) : "nothing that can be read", "a number above 0");
  }

  /// Each link but one has one joint that carries it; from the root every link is reached.
  std::optional<UrdfLayout> tree() {
    UrdfLayout layout;
    std::vector<int> carried(said_.links.size(), -1);
    bool sound = said_.links.size() == link_.size();  // else a name means two links, or none
    for (std::size_t j = 0; j < said_.joints.size(); ++j) {
      const JointSaid& joint = said_.joints[j];
      const auto parent = link_.find(joint.parent);
      const auto child = link_.find(joint.child);
      layout.parent_link.push_back(parent == link_.end() ? -1 : parent->second);
      layout.child_link.push_back(child == link_.end() ? -1 : child->second);
      if (parent == link_.end() || child == link_.end()) {
        sound = false;
        continue;
      }
      int& carrier = carried[static_cast<std::size_t>(child->second)];
      if (carrier >= 0) {
        add(field_of(said_.links[static_cast<std::size_t>(child->second)]),
            "two joints that carry it: " + shown_name(said_.joints[static_cast<std::size_t>(carrier)].name) +
                " and " + shown_name(joint.name),
            "one: a closed loop is no tree");
        sound = false;
        continue;
      }
      carrier = static_cast<int>(j);
    }
    if (!sound) return std::nullopt;
    return find_root(carried, layout) && go_out(layout) ? std::optional(layout) : std::nullopt;
  }

  bool find_root(const std::vector<int>& carried, UrdfLayout& layout) {
    std::string roots;
    int count = 0;
    for (std::size_t i = 0; i < carried.size(); ++i) {
      if (carried[i] >= 0) continue;
      if (layout.root < 0) layout.root = static_cast<int>(i);
      ++count;
      if (count <= 5) roots += (roots.empty() ? "" : ", ") + shown_name(said_.links[i].name);
    }
    if (count == 1) return true;
    if (count == 0)
      add("robot", "every link carried by a joint: a closed loop",
          "one link, the trunk, that no joint carries");
    if (count > 1) {
      add("robot",
          std::to_string(count) + " links that no joint carries: " + roots + (count > 5 ? ", ..." : ""),
          "one, the trunk");
    }
    return false;
  }

  /// Joints in order from the root; a link that is not reached is part of a loop of its own.
  bool go_out(UrdfLayout& layout) {
    std::vector<std::vector<int>> carries(said_.links.size());
    for (std::size_t j = said_.joints.size(); j-- > 0;) {
      carries[static_cast<std::size_t>(layout.parent_link[j])].push_back(static_cast<int>(j));
    }
    std::vector<bool> reached(said_.links.size(), false);
    reached[static_cast<std::size_t>(layout.root)] = true;
    std::vector<int> next = carries[static_cast<std::size_t>(layout.root)];
    while (!next.empty()) {
      const int joint = next.back();
      next.pop_back();
      layout.order.push_back(joint);
      const auto child = static_cast<std::size_t>(layout.child_link[static_cast<std::size_t>(joint)]);
      reached[child] = true;
      next.insert(next.end(), carries[child].begin(), carries[child].end());
    }
    bool whole = true;
    for (std::size_t i = 0; i < reached.size(); ++i) {
      if (reached[i]) continue;
      add(field_of(said_.links[i]),
          "no way to it from " + shown_name(said_.links[static_cast<std::size_t>(layout.root)].name) +
              ": it is part of a closed loop",
          "a tree");
      whole = false;
    }
    return whole;
  }

  /// Links joined by fixed joints are one body, which must have a mass.
  void bodies(const UrdfLayout& layout) {
    std::vector<int> body(said_.links.size(),
                          layout.root);  // of each link: the link that the moving joint carries
    for (const int j : layout.order) {
      const auto joint = static_cast<std::size_t>(j);
      const auto child = static_cast<std::size_t>(layout.child_link[joint]);
      const auto parent = static_cast<std::size_t>(layout.parent_link[joint]);
      body[child] =
          kind_of(said_.joints[joint]) == JointKind::fixed ? body[parent] : layout.child_link[joint];
    }
    std::vector<bool> has_mass(said_.links.size(), false);
    std::vector<bool> has_shape(said_.links.size(), false);
    for (std::size_t i = 0; i < body.size(); ++i) {
      const auto b = static_cast<std::size_t>(body[i]);
      has_mass[b] = has_mass[b] || said_.links[i].has_inertial;
      has_shape[b] = has_shape[b] || said_.links[i].has_shape;
    }
    for (std::size_t i = 0; i < body.size(); ++i) {
      if (body[i] != static_cast<int>(i) || has_mass[i]) continue;
      add(field_of(said_.links[i]), has_shape[i] ? "shapes only, no inertial element" : "no inertial element",
          "mass and inertia of a body that moves");
    }
  }

  const UrdfDocument& said_;
  const std::string& path_;
  files::Defects& defects_;
  std::map<std::string, int> link_;
};

}  // namespace

JointKind kind_of(const JointSaid& joint) {
  if (joint.type == "revolute") return JointKind::hinge;
  if (joint.type == "continuous") return JointKind::turning;
  if (joint.type == "prismatic") return JointKind::sliding;
  if (joint.type == "fixed") return JointKind::fixed;
  return JointKind::other;
}

std::optional<UrdfLayout> judge_document(const UrdfDocument& document, const std::string& path,
                                         files::Defects& defects) {
  return Judge(document, path, defects).run();
}

}  // namespace pastern::tools
