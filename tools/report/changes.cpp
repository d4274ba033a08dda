// See changes.h. Layout of the parameters: proto/pastern/v1/policy.proto (layers one after another, weights
// row by row, then the bias).
#include "tools/report/changes.h"

#include <fmt/format.h>

#include <algorithm>
#include <cmath>
#include <numeric>

namespace pastern::tools {
namespace {

std::string channel_name(const v1::Channel& channel) {
  switch (channel.kind()) {
    case v1::Channel::ONE:
      return "constant";
    case v1::Channel::ROLL:
      return "roll";
    case v1::Channel::PITCH:
      return "pitch";
    case v1::Channel::ROLL_RATE:
      return "roll rate";
    case v1::Channel::PITCH_RATE:
      return "pitch rate";
    case v1::Channel::YAW_RATE:
      return "yaw rate";
    case v1::Channel::JOINT_OFFSET:
      return channel.joint() + " offset";
    case v1::Channel::JOINT_SPEED:
      return channel.joint() + " speed";
    case v1::Channel::PHASE_SIN:
      return "phase sine";
    case v1::Channel::PHASE_COS:
      return "phase cosine";
    default:
      return "channel";
  }
}

/// Names of the network's outputs, in their order.
std::vector<std::string> output_names(const v1::Policy& policy) {
  std::vector<std::string> names;
  for (const v1::LegAction& leg : policy.legs()) {
    names.push_back(leg.leg() + " leg angle");
    names.push_back(leg.leg() + " leg length");
    if (leg.abduction_rad() != 0) names.push_back(leg.leg() + " abduction");
  }
  return names;
}

std::string output_name(const v1::Policy& policy, int layer, std::size_t row) {
  if (layer + 1 < policy.layers_size()) return fmt::format("layer {} unit {}", layer + 1, row + 1);
  const std::vector<std::string> names = output_names(policy);
  return names.size() == policy.layers(layer).outputs() ? names[row] : fmt::format("output {}", row + 1);
}

std::string input_name(const v1::Policy& policy, int layer, std::size_t column) {
  if (layer > 0) return fmt::format("layer {} unit {}", layer, column + 1);
  const bool known = static_cast<int>(column) < policy.channels_size();
  return known ? channel_name(policy.channels(static_cast<int>(column)))
               : fmt::format("input {}", column + 1);
}

double norm(const Parameters& values, std::size_t first, std::size_t count) {
  double squares = 0;
  for (std::size_t i = first; i < first + count; ++i) squares += values[i] * values[i];
  return std::sqrt(squares);
}

}  // namespace

std::string parameter_name(const v1::Policy& policy, std::size_t index) {
  std::size_t left = index;
  for (int layer = 0; layer < policy.layers_size(); ++layer) {
    const std::size_t rows = policy.layers(layer).outputs();
    const std::size_t columns = policy.layers(layer).inputs();
    const std::size_t biases = policy.layers(layer).has_bias() ? rows : 0;
    if (left < rows * columns) {
      return output_name(policy, layer, left / columns) + " <- " + input_name(policy, layer, left % columns);
    }
    left -= rows * columns;
    if (left < biases) return output_name(policy, layer, left) + " <- bias";
    left -= biases;
  }
  return fmt::format("parameter {}", index);
}

std::vector<GroupChange> group_changes(const v1::Policy& policy, const Parameters& from,
                                       const Parameters& to) {
  std::vector<GroupChange> changes;
  if (from.size() != to.size()) return changes;
  Parameters difference(from.size());
  for (std::size_t i = 0; i < from.size(); ++i) difference[i] = to[i] - from[i];
  for (const v1::ParameterGroup& group : policy.groups()) {
    if (std::size_t{group.first()} + group.count() > from.size()) continue;
    changes.push_back({group.name(), group.count(), norm(from, group.first(), group.count()),
                       norm(difference, group.first(), group.count())});
  }
  if (changes.empty())
    changes.push_back({"all", from.size(), norm(from, 0, from.size()), norm(difference, 0, from.size())});
  return changes;
}

std::vector<ParameterChange> largest_changes(const v1::Policy& policy, const Parameters& from,
                                             const Parameters& to, std::size_t most) {
  std::vector<ParameterChange> changes;
  if (from.size() != to.size()) return changes;
  std::vector<std::size_t> order(from.size());
  std::iota(order.begin(), order.end(), std::size_t{0});
  std::stable_sort(order.begin(), order.end(), [&](std::size_t a, std::size_t b) {
    return std::abs(to[a] - from[a]) > std::abs(to[b] - from[b]);
  });
  for (const std::size_t i : order) {
    if (changes.size() == most || to[i] == from[i]) break;
    changes.push_back({parameter_name(policy, i), from[i], to[i]});
  }
  return changes;
}

}  // namespace pastern::tools
