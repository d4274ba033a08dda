// Reads a policy file and judges every part of it against its robot; the message carries no rules of its own.
#include "proto/files/policy_file.h"

#include <algorithm>
#include <cmath>
#include <limits>
#include <set>

#include "proto/files/artefact.h"
#include "proto/files/text.h"
#include "proto/files/words.h"

namespace pastern::files {
namespace {

constexpr int kMostInputs = 512;
constexpr std::uint32_t kMostUnits = 1024;
constexpr int kMostLayers = 8;
constexpr std::size_t kMostText = 4000;
constexpr double kMostParameter = 1e6;

class Judge {
 public:
  Judge(const v1::Policy& policy, const RobotFile& robot, const std::string& file, Defects& defects)
      : policy_(policy), robot_(robot), file_(file), defects_(defects) {}

  void run() {
    require(policy_.format() == 1, "format", std::to_string(policy_.format()), "format 1");
    // Another format may mean something else by every field.
    if (policy_.format() != 1) return;
    text(policy_.name(), 1, 40, "name");
    require(policy_.robot() == robot_.robot().name(), "robot", policy_.robot(), robot_.robot().name());
    require(policy_.scalar() == v1::Policy::FLOAT || policy_.scalar() == v1::Policy::DOUBLE, "scalar",
            std::to_string(policy_.scalar()), "FLOAT or DOUBLE");
    rates();
    channels();
    const std::uint32_t actions = legs();
    layers(actions);
    parameters();
    groups();
    provenance();
  }

 private:
  void require(bool sound, const std::string& field, const std::string& found, const std::string& expected) {
    if (!sound) defects_.push_back({file_, field, found, expected});
  }
  void require(bool sound, const std::string& field, double found, const std::string& expected) {
    require(sound, field, shown_number(found), expected);
  }

  void text(const std::string& value, std::size_t least, std::size_t most, const std::string& field) {
    const bool plain = printable(value, true);
    require(plain && value.size() >= least && value.size() <= most, field,
            plain ? std::to_string(value.size()) + " characters" : "bytes that are no text",
            "a text of " + std::to_string(least) + " to " + std::to_string(most) + " characters");
  }

  void scale(double value, const std::string& field) {
    require(std::isfinite(value) && value != 0 && std::abs(value) <= kMostParameter, field, value,
            "finite, not 0, at most 1e6");
  }

  void rates() {
    const double cycle = robot_.robot().cycle_hz();
    const double ticks = cycle / policy_.rate_hz();
    require(policy_.rate_hz() >= 5 && policy_.rate_hz() <= cycle, "rate_hz", policy_.rate_hz(),
            "5 to the robot's cycle_hz, " + shown_number(cycle) + " (Hz)");
    require(std::abs(ticks - std::round(ticks)) <= 1e-9, "rate_hz", policy_.rate_hz(),
            "a rate that divides the robot's cycle_hz, " + shown_number(cycle) + " (Hz)");
    require(policy_.gait_hz() >= 0.2 && policy_.gait_hz() <= 10, "gait_hz", policy_.gait_hz(),
            "0.2 to 10 (Hz)");
  }

  void channels() {
    const int count = policy_.channels_size();
    require(count >= 1 && count <= kMostInputs, "channels", std::to_string(count) + " entries",
            "1 to 512 entries");
    for (int i = 0; i < count; ++i) {
      const v1::Channel& channel = policy_.channels(i);
      const std::string at = "channels[" + std::to_string(i) + "]";
      require(channel.kind() >= v1::Channel::ONE && channel.kind() <= v1::Channel::PHASE_COS, at + ".kind",
              std::to_string(channel.kind()), "a known kind");
      const bool of_joint =
          channel.kind() == v1::Channel::JOINT_OFFSET || channel.kind() == v1::Channel::JOINT_SPEED;
      if (of_joint) {
        require(robot_.joint_index(channel.joint()) >= 0, at + ".joint", channel.joint(),
                "a joint of " + robot_.robot().name());
      } else {
        require(channel.joint().empty(), at + ".joint", channel.joint(), "nothing for this kind");
      }
      scale(channel.scale(), at + ".scale");
      require(std::isfinite(channel.offset()) && std::abs(channel.offset()) <= kMostParameter, at + ".offset",
              channel.offset(), "finite, at most 1e6");
    }
  }

  // Number of actions.
  std::uint32_t legs() {
    std::set<std::string> seen;
    std::uint32_t actions = 0;
    for (int i = 0; i < policy_.legs_size(); ++i) {
      const v1::LegAction& action = policy_.legs(i);
      const std::string at = "legs[" + std::to_string(i) + "]";
      const auto& known = robot_.robot().legs();
      const auto leg = std::find_if(known.begin(), known.end(),
                                    [&](const v1::Leg& one) { return one.name() == action.leg(); });
      require(leg != known.end(), at + ".leg", action.leg(), "a leg of " + robot_.robot().name());
      require(seen.insert(action.leg()).second, at + ".leg", action.leg() + ", said before", "each leg once");
      scale(action.angle_rad(), at + ".angle_rad");
      scale(action.length_m(), at + ".length_m");
      if (leg == known.end()) continue;
      const bool abducts = !leg->abduction().empty();
      if (abducts) {
        scale(action.abduction_rad(), at + ".abduction_rad");
      } else {
        require(action.abduction_rad() == 0, at + ".abduction_rad", action.abduction_rad(),
                "0: the leg has no abduction");
      }
      actions += abducts ? 3 : 2;
    }
    require(policy_.legs_size() == robot_.robot().legs_size(), "legs",
            std::to_string(policy_.legs_size()) + " entries",
            std::to_string(robot_.robot().legs_size()) + ", each leg of the robot once");
    return actions;
  }

  void layers(std::uint32_t actions) {
    const int count = policy_.layers_size();
    require(count >= 1 && count <= kMostLayers, "layers", std::to_string(count) + " entries",
            "1 to 8 entries");
    auto width = static_cast<std::uint32_t>(policy_.channels_size());
    std::uint64_t held = 0;
    for (int i = 0; i < count; ++i) {
      const v1::Layer& layer = policy_.layers(i);
      const std::string at = "layers[" + std::to_string(i) + "]";
      require(layer.inputs() == width, at + ".inputs", std::to_string(layer.inputs()),
              std::to_string(width) + ", what stands before it");
      require(layer.outputs() >= 1 && layer.outputs() <= kMostUnits, at + ".outputs",
              std::to_string(layer.outputs()), "1 to 1024");
      require(layer.activation() == v1::Layer::IDENTITY || layer.activation() == v1::Layer::TANH,
              at + ".activation", std::to_string(layer.activation()), "IDENTITY or TANH");
      held += (static_cast<std::uint64_t>(layer.inputs()) + (layer.has_bias() ? 1 : 0)) * layer.outputs();
      width = layer.outputs();
    }
    require(width == actions, "layers", std::to_string(width) + " outputs",
            std::to_string(actions) + ", one for each action");
    require(held == static_cast<std::uint64_t>(policy_.parameters_size()), "parameters",
            std::to_string(policy_.parameters_size()) + " numbers",
            std::to_string(held) + ", what the layers hold");
  }

  void parameters() {
    for (int i = 0; i < policy_.parameters_size(); ++i) {
      const double value = policy_.parameters(i);
      if (std::isfinite(value) && std::abs(value) <= kMostParameter) continue;
      require(false, "parameters[" + std::to_string(i) + "]", value, "finite, at most 1e6");
      return;  // one line is enough: there may be thousands
    }
  }

  void groups() {
    require(policy_.groups_size() >= 1 && policy_.groups_size() <= 64, "groups",
            std::to_string(policy_.groups_size()) + " entries", "1 to 64 entries");
    std::vector<bool> taken(static_cast<std::size_t>(policy_.parameters_size()), false);
    std::set<std::string> seen;
    for (int i = 0; i < policy_.groups_size(); ++i) {
      const v1::ParameterGroup& group = policy_.groups(i);
      const std::string at = "groups[" + std::to_string(i) + "]";
      text(group.name(), 1, 40, at + ".name");
      require(seen.insert(group.name()).second, at + ".name", group.name() + ", said before",
              "each name once");
      require(group.perturbation_scale() > 0 && group.perturbation_scale() <= 10, at + ".perturbation_scale",
              group.perturbation_scale(), "above 0 and at most 10");
      const std::uint64_t end = static_cast<std::uint64_t>(group.first()) + group.count();
      const bool inside = group.count() > 0 && end <= taken.size();
      require(inside, at, std::to_string(group.first()) + " to " + std::to_string(end),
              "a stretch of the " + std::to_string(taken.size()) + " parameters");
      if (!inside) continue;
      const auto first = taken.begin() + static_cast<std::ptrdiff_t>(group.first());
      const auto last = taken.begin() + static_cast<std::ptrdiff_t>(end);
      require(std::find(first, last, true) == last, at, "parameters of another group",
              "groups that do not overlap");
      std::fill(first, last, true);
    }
  }

  void provenance() {
    if (!policy_.has_provenance()) return;
    const v1::Provenance& provenance = policy_.provenance();
    const std::size_t parent = provenance.parent_sha256().size();
    require(parent == 0 || parent == std::tuple_size_v<Sha256>, "provenance.parent_sha256",
            std::to_string(parent) + " bytes", "0 or 32 bytes");
    text(provenance.made_by(), 0, 40, "provenance.made_by");
    text(provenance.text(), 0, kMostText, "provenance.text");
    text(provenance.software(), 0, 200, "provenance.software");
  }

  const v1::Policy& policy_;
  const RobotFile& robot_;
  const std::string& file_;
  Defects& defects_;
};

}  // namespace

std::optional<PolicyFile> parse_policy(const std::string& bytes, const std::string& file,
                                       const RobotFile& robot, Defects& defects) {
  PolicyFile policy;
  if (!unpack_artefact(bytes, kPolicyKind, file, policy.policy_, defects)) return std::nullopt;
  const std::size_t before = defects.size();
  Judge(policy.policy_, robot, file, defects).run();
  if (defects.size() != before) return std::nullopt;
  policy.sha256_ = files::sha256(bytes);
  policy.bytes_ = bytes;
  return policy;
}

std::optional<PolicyFile> read_policy(const std::string& path, const RobotFile& robot, Defects& defects) {
  const std::optional<std::string> bytes = read_whole(path, defects);
  if (!bytes) return std::nullopt;
  return parse_policy(*bytes, path, robot, defects);
}

std::string pack_policy(const v1::Policy& policy) { return pack_artefact(kPolicyKind, policy); }

}  // namespace pastern::files
