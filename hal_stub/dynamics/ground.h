// The ground as a height field over the lane: a plane, with waves and rounded steps along the lane upon it,
// and patches of other friction. How a point lies over it: depth, normal from the field's gradient there,
// friction.
#pragma once

#include <array>

#include "hal_stub/dynamics/vector.h"

namespace pastern::stub {

inline constexpr int kMaxRisers = 16;
inline constexpr int kMaxPatches = 8;

/// A step of the ground: it rises by 3 u^2 - 2 u^3 of `rise`, u from 0 to 1 over its length, so that height
/// and gradient have no jump.
template <class S>
struct Riser {
  S from{0};            ///< along the lane, m
  S rise{0};            ///< m, negative: down
  S inverse_length{0};  ///< 1/m
};

/// A rectangle of another friction.
template <class S>
struct Patch {
  S from{0};  ///< along the lane, m
  S to{0};
  S right{0};  ///< across, left is positive, m
  S left{0};
  S friction{0};
};

/// What stands up from the plane, along its normal. Counts are plain: with several robots side by side they
/// are the most that any has, and what one has less of rises by 0 or is a patch of no length.
template <class S>
struct Relief {
  S amplitude{0};    ///< of the sine, half of crest to trough, m
  S wave_number{0};  ///< 2 pi / length, rad/m
  std::array<Riser<S>, kMaxRisers> riser{};
  S top{0};  ///< nothing rises higher, m
  int riser_count{0};
  bool waves{false};
};

/// A plane through the world's origin; unless it is plain, with relief, patches and a friction law of its
/// own.
template <class S>
struct Ground {
  Vec3<S> normal{S(0), S(0), S(1)};  ///< of the plane, world axes, across y: the lane runs along x
  S friction{S(0.8)};
  S stiffness{S(24000)};   ///< N/m
  S damping{S(400)};       ///< N s/m
  S stick_speed{S(0.02)};  ///< friction grows linearly up to this sliding speed, m/s
  S peak{S(0)};            ///< stick peak: friction at rest is (1 + peak) times the sliding one
  S fading{S(0)};          ///< part of the friction that is lost up to kFadeSpeed of sliding
  S bounce{S(0)};          ///< damping that grows with the depth: stiffness * bounce * depth, s/m
  Relief<S> relief{};
  std::array<Patch<S>, kMaxPatches> patch{};
  int patch_count{0};
  bool plain{true};  ///< nothing but normal, friction, stiffness, damping and stick speed counts
};

/// The pair of figures of two grounds, one after another: f(to.friction, from.friction) and so on; flags and
/// counts become those of both together. Spreads a site over lanes, or puts one into its lane.
template <class S, class D, class F>
inline void pair_grounds(Ground<S>& to, const Ground<D>& from, F&& f) {
  f(to.normal.x, from.normal.x);
  f(to.normal.y, from.normal.y);
  f(to.normal.z, from.normal.z);
  f(to.friction, from.friction);
  f(to.stiffness, from.stiffness);
  f(to.damping, from.damping);
  f(to.stick_speed, from.stick_speed);
  f(to.peak, from.peak);
  f(to.fading, from.fading);
  f(to.bounce, from.bounce);
  f(to.relief.amplitude, from.relief.amplitude);
  f(to.relief.wave_number, from.relief.wave_number);
  f(to.relief.top, from.relief.top);
  for (std::size_t i = 0; i < kMaxRisers; ++i) {
    f(to.relief.riser[i].from, from.relief.riser[i].from);
    f(to.relief.riser[i].rise, from.relief.riser[i].rise);
    f(to.relief.riser[i].inverse_length, from.relief.riser[i].inverse_length);
  }
  for (std::size_t i = 0; i < kMaxPatches; ++i) {
    f(to.patch[i].from, from.patch[i].from);
    f(to.patch[i].to, from.patch[i].to);
    f(to.patch[i].right, from.patch[i].right);
    f(to.patch[i].left, from.patch[i].left);
    f(to.patch[i].friction, from.patch[i].friction);
  }
  if (from.relief.riser_count > to.relief.riser_count) to.relief.riser_count = from.relief.riser_count;
  if (from.patch_count > to.patch_count) to.patch_count = from.patch_count;
  to.relief.waves = to.relief.waves || from.relief.waves;
  to.plain = to.plain && from.plain;
}

/// The same ground under each lane.
template <class S, class D>
inline Ground<S> spread_ground(const Ground<D>& from) {
  Ground<S> to;
  pair_grounds(to, from, [](S& a, const D& b) { a = S(b); });
  return to;
}

/// Height of the relief and its gradient along the lane.
template <class S>
struct Profile {
  S height;
  S gradient;
};

template <class S>
inline Profile<S> profile_at(const Relief<S>& relief, const S& along) noexcept {
  using C = Constant<S>;
  Profile<S> sum{S(0), S(0)};
  if (relief.waves) {
    const SinCos<S> wave = sin_cos(along * relief.wave_number);
    sum.height = relief.amplitude * wave.sin;
    sum.gradient = relief.amplitude * relief.wave_number * wave.cos;
  }
  for (std::size_t i = 0; i < static_cast<std::size_t>(relief.riser_count); ++i) {
    const Riser<S>& riser = relief.riser[i];
    const S u = max(min((along - riser.from) * riser.inverse_length, S(C(1))), S(0));
    sum.height = sum.height + riser.rise * (u * u * (C(3) - u * C(2)));
    sum.gradient = sum.gradient + riser.rise * riser.inverse_length * (u * (C(1) - u) * C(6));
  }
  return sum;
}

/// Where the plane lies, seen from the trunk.
template <class S>
struct Below {
  Vec3<S> normal;  ///< trunk axes
  S height;        ///< of the trunk's origin, along the normal
};

/// Where the trunk stands on the lane.
template <class S>
struct Stand {
  Vec3<S> along;  ///< the lane's direction in the plane, trunk axes
  Vec3<S> left;   ///< trunk axes
  S way;          ///< of the trunk's origin along the lane, m
  S side;         ///< and across it
};

/// The lane's direction in the plane, world axes.
template <class S>
inline Vec3<S> lane_of(const Ground<S>& ground) noexcept {
  return {ground.normal.z, S(0), S(0) - ground.normal.x};
}

/// Of a point, along the plane's normal, m.
template <class S>
inline S height_over(const Ground<S>& ground, const Vec3<S>& position) noexcept {
  const S height = dot(ground.normal, position);
  if (ground.plain) return height;
  return height - profile_at(ground.relief, dot(lane_of(ground), position)).height;
}

/// `body`: trunk to world; `position` of the trunk's origin, world.
template <class S>
inline Below<S> below_of(const Ground<S>& ground, const Rotation<S>& body, const Vec3<S>& position) noexcept {
  return {turn_back(body, ground.normal), dot(ground.normal, position)};
}
template <class S>
inline Stand<S> stand_of(const Ground<S>& ground, const Rotation<S>& body, const Vec3<S>& position) noexcept {
  const Vec3<S> along = lane_of(ground);
  return {turn_back(body, along), turn_back(body, Vec3<S>{S(0), S(1), S(0)}), dot(along, position),
          position.y};
}

/// What a point meets in a step, on a plain ground and on any other.
template <class S>
struct PlainFooting {
  const Ground<S>& ground;
  const Below<S>& below;
  Constant<S> dt;
};
template <class S>
struct ShapedFooting {
  const Ground<S>& ground;
  const Below<S>& below;
  Stand<S> stand;
  Constant<S> dt;
};

/// How a ball lies on the ground.
template <class S>
struct Lie {
  Vec3<S> normal;  ///< of the ground at the point of contact, trunk axes
  S depth;         ///< of the ball's lowest point, m
  S friction;
};

template <class S>
inline Lie<S> lie_of(const PlainFooting<S>& on, const Vec3<S>& centre, const S& radius) noexcept {
  return {on.below.normal, radius - on.below.height - dot(on.below.normal, centre), on.ground.friction};
}

template <class S>
inline S friction_on_patches(const Ground<S>& ground, const S& way, const S& side) noexcept {
  S friction = ground.friction;
  for (std::size_t i = 0; i < static_cast<std::size_t>(ground.patch_count); ++i) {
    const Patch<S>& patch = ground.patch[i];
    const auto on = (way > patch.from) & (way < patch.to) & (side > patch.right) & (side < patch.left);
    friction = select(on, patch.friction, friction);
  }
  return friction;
}

/// The gradient under the ball's centre says where it touches, height and gradient there how deep and which
/// way: to first order in the ball's radius over the ground's radius of curvature, exact on a slope.
template <class S>
inline Lie<S> lie_of(const ShapedFooting<S>& on, const Vec3<S>& centre, const S& radius) noexcept {
  using C = Constant<S>;
  const Below<S>& below = on.below;
  const Relief<S>& relief = on.ground.relief;
  const S over = below.height + dot(below.normal, centre);
  if (!any(over < radius + relief.top)) return {below.normal, radius + relief.top - over, on.ground.friction};
  const S way = on.stand.way + dot(on.stand.along, centre);
  const S first = profile_at(relief, way).gradient;
  const S lean = C(1) / sqrt(first * first + C(1));
  const S touching = way + radius * first * lean;
  const Profile<S> there = profile_at(relief, touching);
  const S steep = C(1) / sqrt(there.gradient * there.gradient + C(1));
  return {(below.normal - on.stand.along * there.gradient) * steep,
          (there.height - over + radius * lean) * steep,
          friction_on_patches(on.ground, touching, on.stand.side + dot(on.stand.left, centre))};
}

inline constexpr double kPeakSpeed = 0.1;  ///< m/s of sliding at which half of a stick peak is left
inline constexpr double kFadeSpeed = 0.3;  ///< m/s of sliding at which friction has lost all of `fading`

template <class S>
inline S friction_at(const PlainFooting<S>&, const S& friction, const S&) noexcept {
  return friction;
}

/// Friction at a sliding speed. The stick peak falls as 1 / (1 + (v/v0)^2), a usual form of the fall from
/// static to sliding friction (Friction at a lubricated line contact operating at oscillating sliding
/// velocities, J. Tribology 112 (1990); from memory); the fading is linear.
template <class S>
inline S friction_at(const ShapedFooting<S>& on, const S& friction, const S& slide) noexcept {
  using C = Constant<S>;
  const Ground<S>& ground = on.ground;
  const S beyond = max(slide - ground.stick_speed, S(0)) * C(1 / kPeakSpeed);
  const S peak = ground.peak / (beyond * beyond + C(1)) + C(1);
  const S left = C(1) - ground.fading * min(slide * C(1 / kFadeSpeed), S(C(1)));
  return friction * peak * left;
}

/// Damping along the normal at a depth, N s/m.
template <class S>
inline S damping_at(const PlainFooting<S>& on, const S&) noexcept {
  return on.ground.damping;
}
/// It may grow with the depth, c = c0 + k a d: the law of Coefficient of restitution interpreted as damping
/// in vibroimpact (J. Applied Mechanics 42 (1975)) with exponent 1.
template <class S>
inline S damping_at(const ShapedFooting<S>& on, const S& depth) noexcept {
  return on.ground.damping + on.ground.stiffness * on.ground.bounce * max(depth, S(0));
}

}  // namespace pastern::stub
