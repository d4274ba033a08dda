// Every number is drawn whether it is used or not, so that a range of one does not shift the draws of
// another.
#include "tools/train/sites.h"

#include <algorithm>

#include "tools/train/draws.h"

namespace pastern::tools {

SiteRanges wide_ranges() {
  SiteRanges ranges;
  ranges.load_kg = {0, 4.5};
  ranges.load_x_m = {-0.15, 0.15};
  ranges.load_y_m = {-0.11, 0.11};
  ranges.load_z_m = {0.06, 0.12};  // on the trunk
  ranges.pack_voltage_ratio = {0.70, 1.05};
  ranges.friction = {0.30, 1.0};
  ranges.joint_damping_nm_s_per_rad = {0.04, 0.4};
  ranges.joint_coulomb_nm = {0.1, 0.7};
  ranges.command_delay_s = {0.002, 0.026};
  ranges.slope_rad = {-0.07, 0.07};
  ranges.strength = {0.85, 1.05};
  ranges.weak_share = 0.6;
  ranges.weak_strength = {0.5, 0.95};
  ranges.push_m_per_s = {0, 0.25};
  ranges.start_scatter_rad = 0.05;
  ranges.winding_start_c = {20, 60};
  return ranges;
}

stub::Site draw_site(const stub::Model& model, const SiteRanges& ranges, std::uint64_t seed,
                     std::uint64_t index) {
  Draws draws(seed, Purpose::site, index);
  const auto in = [&draws](const Range& range) { return draws.between(range.low, range.high); };
  stub::Site site = stub::nominal_site(model);
  site.load_kg = in(ranges.load_kg);
  site.load_at_m = {in(ranges.load_x_m), in(ranges.load_y_m), in(ranges.load_z_m)};
  site.pack_voltage_ratio = in(ranges.pack_voltage_ratio);
  site.friction = in(ranges.friction);
  const double damping = in(ranges.joint_damping_nm_s_per_rad);
  const double coulomb = in(ranges.joint_coulomb_nm);
  site.command_delay_s = in(ranges.command_delay_s);
  site.slope_rad = in(ranges.slope_rad);
  site.push_m_per_s = in(ranges.push_m_per_s);
  site.winding_start_c = in(ranges.winding_start_c);
  site.start_scatter_rad = ranges.start_scatter_rad;
  const bool weak = draws.uniform() < ranges.weak_share;
  const int joints = model.joint_count();
  const int weak_joint = std::min(joints - 1, static_cast<int>(draws.uniform() * joints));
  const double weakness = in(ranges.weak_strength);
  for (int i = 0; i < joints; ++i) {
    const auto j = static_cast<std::size_t>(i);
    site.strength[j] = in(ranges.strength) * (weak && i == weak_joint ? weakness : 1);
    site.damping_nm_s_per_rad[j] = damping;
    site.coulomb_nm[j] = coulomb;
  }
  return site;
}

}  // namespace pastern::tools
