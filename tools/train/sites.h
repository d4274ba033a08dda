// Randomised sites to train and judge policies on.
#pragma once

#include <cstdint>

#include "hal_stub/robot/model.h"
#include "hal_stub/robot/site.h"

namespace pastern::tools {

struct Range {
  double low{0};
  double high{0};
};

/// Uniform ranges of everything that varies from site to site.
struct SiteRanges {
  Range load_kg;
  Range load_x_m;
  Range load_y_m;
  Range load_z_m;
  Range pack_voltage_ratio;
  Range friction;
  Range joint_damping_nm_s_per_rad;
  Range joint_coulomb_nm;
  Range command_delay_s;
  Range slope_rad;
  Range strength;        ///< of each joint
  double weak_share{0};  ///< of the draws with one weak joint
  Range weak_strength;   ///< times its strength
  Range push_m_per_s;
  double start_scatter_rad{0};
  Range winding_start_c;
};

/// What start policies are trained for and judged by.
[[nodiscard]] SiteRanges wide_ranges();

/// Site number `index` of a seed.
[[nodiscard]] stub::Site draw_site(const stub::Model& model, const SiteRanges& ranges, std::uint64_t seed,
                                   std::uint64_t index);

}  // namespace pastern::tools
