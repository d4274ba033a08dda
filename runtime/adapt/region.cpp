// Trust region by groups, and the counter-based perturbations.
#include "runtime/adapt/region.h"

#include <algorithm>
#include <cmath>
#include <stdexcept>
#include <utility>

#include "runtime/adapt/random.h"

namespace pastern::adapt {
namespace {

// Judging allows this much above the radius, relative: rounding in the shrinking never makes an own proposal
// fail.
constexpr double kRounding = 1e-9;

double change_norm(const Parameters& start, const Parameters& point, const Group& group) {
  double sum = 0;
  for (std::size_t i = group.first; i < group.first + group.count; ++i)
    sum += (point[i] - start[i]) * (point[i] - start[i]);
  return std::sqrt(sum);
}

double radius_of(const Parameters& start, const Group& group, double trust_region) {
  double sum = 0;
  for (std::size_t i = group.first; i < group.first + group.count; ++i) sum += start[i] * start[i];
  return trust_region * std::sqrt(sum);
}

bool fits(const Group& group, std::size_t size) {
  return group.first <= size && group.count <= size - group.first;
}

std::vector<bool> membership(const std::vector<Group>& groups, std::size_t size) {
  std::vector<bool> member(size, false);
  for (const Group& group : groups)
    for (std::size_t i = group.first; i < group.first + group.count; ++i) member[i] = true;
  return member;
}

void check(const Settings& settings, const Parameters& start) {
  const auto refuse = [](const std::string& words) { throw std::invalid_argument("adaptation: " + words); };
  if (start.empty()) refuse("no parameters");
  if (!std::all_of(start.begin(), start.end(), [](double x) { return std::isfinite(x); }))
    refuse("a start parameter is not finite");
  if (!(settings.trust_region > 0) || !std::isfinite(settings.trust_region))
    refuse("trust region is not a positive number");
  if (settings.groups.empty()) refuse("no parameter group");
  std::vector<bool> taken(start.size(), false);
  for (const Group& group : settings.groups) {
    if (group.count == 0 || !fits(group, start.size()))
      refuse("group '" + group.name + "' reaches beyond the parameters or is empty");
    if (!(group.perturbation_scale > 0) || !std::isfinite(group.perturbation_scale))
      refuse("group '" + group.name + "' has no positive perturbation scale");
    for (std::size_t i = group.first; i < group.first + group.count; ++i) {
      if (taken[i]) refuse("group '" + group.name + "' overlaps another");
      taken[i] = true;
    }
  }
}

}  // namespace

Region::Region(const Settings& settings, Parameters start)
    : start_(std::move(start)),
      groups_(settings.groups),
      seed_(settings.seed),
      trust_region_(settings.trust_region) {
  check(settings, start_);
}

Parameters Region::shrunk(Parameters point) const {
  for (const Group& group : groups_) {
    const double radius = radius_of(start_, group, trust_region_);
    const double norm = change_norm(start_, point, group);
    if (norm <= radius) continue;
    const double factor = std::isfinite(norm) ? radius / norm : 0.0;
    for (std::size_t i = group.first; i < group.first + group.count; ++i)
      point[i] = factor > 0 ? start_[i] + factor * (point[i] - start_[i]) : start_[i];
  }
  return point;
}

Parameters Region::perturbed(const Parameters& point, double factor, std::uint32_t batch,
                             std::uint32_t index) const {
  Parameters result = point;
  for (const Group& group : groups_)
    for (std::size_t i = group.first; i < group.first + group.count; ++i)
      result[i] += factor * group.perturbation_scale *
                   random_normal(seed_, Stream::perturbation, batch, index, static_cast<std::uint32_t>(i));
  return shrunk(std::move(result));
}

std::optional<std::string> outside_trust_region(const Parameters& start, const Parameters& candidate,
                                                const std::vector<Group>& groups, double trust_region) {
  if (candidate.size() != start.size()) return "all (another number of parameters)";
  for (const Group& group : groups) {
    if (!fits(group, start.size())) return group.name;
    const double radius = radius_of(start, group, trust_region);
    const double change = change_norm(start, candidate, group);
    // Two norms that overflow are infinite both and compare as equal: that is not inside.
    if (!std::isfinite(change) || !(change <= radius * (1 + kRounding))) return group.name;
  }
  const std::vector<bool> member = membership(groups, start.size());
  for (std::size_t i = 0; i < start.size(); ++i)
    if (!member[i] && !(candidate[i] == start[i]))
      return "none (a parameter outside every group has changed)";
  return std::nullopt;
}

}  // namespace pastern::adapt
