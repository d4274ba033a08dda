// Vectors, rotations and symmetric matrices over the scalar S, written out so that the compiler sees every
// product.
#pragma once

#include "hal_stub/dynamics/scalar.h"

namespace pastern::stub {

template <class S>
struct Vec3 {
  S x;
  S y;
  S z;
};

template <class S>
inline Vec3<S> operator+(const Vec3<S>& a, const Vec3<S>& b) noexcept {
  return {a.x + b.x, a.y + b.y, a.z + b.z};
}
template <class S>
inline Vec3<S> operator-(const Vec3<S>& a, const Vec3<S>& b) noexcept {
  return {a.x - b.x, a.y - b.y, a.z - b.z};
}
template <class S>
inline Vec3<S> operator*(const Vec3<S>& a, const S& k) noexcept {
  return {a.x * k, a.y * k, a.z * k};
}
template <class S>
inline S dot(const Vec3<S>& a, const Vec3<S>& b) noexcept {
  return a.x * b.x + a.y * b.y + a.z * b.z;
}
template <class S>
inline Vec3<S> cross(const Vec3<S>& a, const Vec3<S>& b) noexcept {
  return {a.y * b.z - a.z * b.y, a.z * b.x - a.x * b.z, a.x * b.y - a.y * b.x};
}
template <class S>
inline Vec3<S> zero3() noexcept {
  return {S(0), S(0), S(0)};
}
/// From model figures.
template <class S, class C>
inline Vec3<S> spread(const Vec3<C>& a) noexcept {
  return {S(a.x), S(a.y), S(a.z)};
}

/// A rotation as the images of the three axes: columns.
template <class S>
struct Rotation {
  Vec3<S> x;
  Vec3<S> y;
  Vec3<S> z;
};

template <class S>
inline Vec3<S> operator*(const Rotation<S>& r, const Vec3<S>& a) noexcept {
  return {r.x.x * a.x + r.y.x * a.y + r.z.x * a.z, r.x.y * a.x + r.y.y * a.y + r.z.y * a.z,
          r.x.z * a.x + r.y.z * a.y + r.z.z * a.z};
}
/// Model figures on the right, without spreading them first.
template <class S, class C>
inline Vec3<S> turn(const Rotation<S>& r, const Vec3<C>& a) noexcept {
  return {r.x.x * a.x + r.y.x * a.y + r.z.x * a.z, r.x.y * a.x + r.y.y * a.y + r.z.y * a.z,
          r.x.z * a.x + r.y.z * a.y + r.z.z * a.z};
}
/// The inverse rotation.
template <class S>
inline Vec3<S> turn_back(const Rotation<S>& r, const Vec3<S>& a) noexcept {
  return {dot(r.x, a), dot(r.y, a), dot(r.z, a)};
}

/// Symmetric 3x3.
template <class S>
struct Sym3 {
  S xx;
  S yy;
  S zz;
  S xy;
  S xz;
  S yz;
};

template <class S>
inline Vec3<S> operator*(const Sym3<S>& m, const Vec3<S>& a) noexcept {
  return {m.xx * a.x + m.xy * a.y + m.xz * a.z, m.xy * a.x + m.yy * a.y + m.yz * a.z,
          m.xz * a.x + m.yz * a.y + m.zz * a.z};
}
template <class S>
inline Sym3<S> operator+(const Sym3<S>& a, const Sym3<S>& b) noexcept {
  return {a.xx + b.xx, a.yy + b.yy, a.zz + b.zz, a.xy + b.xy, a.xz + b.xz, a.yz + b.yz};
}

/// Unit quaternion, scalar first, body to world.
template <class S>
struct Quat {
  S w;
  S x;
  S y;
  S z;
};

template <class S>
inline Rotation<S> rotation_of(const Quat<S>& q) noexcept {
  using C = Constant<S>;
  const S xx = q.x * q.x;
  const S yy = q.y * q.y;
  const S zz = q.z * q.z;
  const S xy = q.x * q.y;
  const S xz = q.x * q.z;
  const S yz = q.y * q.z;
  const S wx = q.w * q.x;
  const S wy = q.w * q.y;
  const S wz = q.w * q.z;
  return {{C(1) - C(2) * (yy + zz), C(2) * (xy + wz), C(2) * (xz - wy)},
          {C(2) * (xy - wz), C(1) - C(2) * (xx + zz), C(2) * (yz + wx)},
          {C(2) * (xz + wy), C(2) * (yz - wx), C(1) - C(2) * (xx + yy)}};
}

template <class S>
inline Quat<S> operator*(const Quat<S>& a, const Quat<S>& b) noexcept {
  return {a.w * b.w - a.x * b.x - a.y * b.y - a.z * b.z, a.w * b.x + a.x * b.w + a.y * b.z - a.z * b.y,
          a.w * b.y - a.x * b.z + a.y * b.w + a.z * b.x, a.w * b.z + a.x * b.y - a.y * b.x + a.z * b.w};
}

/// q turned on by the rotation vector `v` (body axes, rad), normalised. Series of the half-angle sine and
/// cosine, exact to 1e-13 for |v| < 0.1 rad, which is 100 rad/s at 1 ms; normalising takes the rest of the
/// length's error.
template <class S>
inline Quat<S> turned_by(const Quat<S>& q, const Vec3<S>& v) noexcept {
  using C = Constant<S>;
  const S h = dot(v, v) * C(0.25);
  const S s = C(0.5) * (C(1) - h * (C(1.0 / 6) - h * (C(1.0 / 120) - h * C(1.0 / 5040))));
  const S c = C(1) - h * (C(0.5) - h * (C(1.0 / 24) - h * C(1.0 / 720)));
  const Quat<S> r = q * Quat<S>{c, v.x * s, v.y * s, v.z * s};
  const S k = C(1) / sqrt(r.w * r.w + r.x * r.x + r.y * r.y + r.z * r.z);
  return {r.w * k, r.x * k, r.y * k, r.z * k};
}

}  // namespace pastern::stub
