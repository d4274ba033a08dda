// The tree of a robot file as limbs: what stands together on one joint of the trunk. A chain of up to four
// hinges that is a leg, or a short one that is none, is stepped as such; every other limb is of the general
// kind.
#pragma once

#include <functional>
#include <string>

#include "hal_stub/dynamics/tree.h"
#include "pastern/v1/robot.pb.h"

namespace pastern::stub {

[[nodiscard]] LinkFigures<double> link_of(const v1::Link& link);

/// Fills the limbs of `tree`. False with one line in `error` for more than 8 limbs, or more than 8 joints in
/// one. Every foot of the file's legs and every `tip_m` may touch the ground; so do, as a fall, the ends of
/// other limbs (their last link's centre of mass) and, with 2 cm about them, the joints that a limb's other
/// joints carry. Of a leg that is a plain chain, the knee alone.
[[nodiscard]] bool take_limbs(const v1::Robot& robot, Tree<double>& tree, std::string& error);

/// f(centre of the ball in trunk axes, its radius) for every contact point of limb `limb`, its first foot
/// first; `angle` in joint order, rad or m.
void for_points(const LegFigures<double>& limb, const double* angle,
                const std::function<void(const Vec3<double>& place, double radius)>& f);

}  // namespace pastern::stub
