// The operations that the simulated robot asks of its scalar type S, here for double and float. A lane type
// brings its own in its own namespace, found by argument-dependent lookup. No branch depends on an S but
// through any().
#pragma once

#include <cmath>

/// Makes one function of all that a step calls. Not under a sanitizer: its checks would be multiplied, and
/// one file would compile for many minutes.
#if defined(__SANITIZE_ADDRESS__) || defined(__SANITIZE_THREAD__)
#define PASTERN_FLATTEN
#else
#define PASTERN_FLATTEN __attribute__((flatten))
#endif

namespace pastern::stub {

/// Which operations: + - * / with S and with its Constant, unary -, comparison < and > giving a mask, select,
/// any, min, max, abs, sqrt, round_even, and & | ! of masks. Constant is the plain number type that model
/// figures are stored in.
template <class S>
struct ScalarTraits {
  using Constant = typename S::Constant;
};
template <>
struct ScalarTraits<double> {
  using Constant = double;
};
template <>
struct ScalarTraits<float> {
  using Constant = float;
};
template <class S>
using Constant = typename ScalarTraits<S>::Constant;

inline double select(bool mask, double yes, double no) noexcept { return mask ? yes : no; }
inline float select(bool mask, float yes, float no) noexcept { return mask ? yes : no; }
inline bool any(bool mask) noexcept { return mask; }
inline double min(double a, double b) noexcept { return a < b ? a : b; }
inline float min(float a, float b) noexcept { return a < b ? a : b; }
inline double max(double a, double b) noexcept { return a > b ? a : b; }
inline float max(float a, float b) noexcept { return a > b ? a : b; }
inline double abs(double a) noexcept { return std::fabs(a); }
inline float abs(float a) noexcept { return std::fabs(a); }
inline double sqrt(double a) noexcept { return std::sqrt(a); }
inline float sqrt(float a) noexcept { return std::sqrt(a); }

/// Nearest whole number, ties to even, for |a| < 2^51 (2^22): adding 1.5 * 2^52 leaves no bits for the
/// fraction.
inline double round_even(double a) noexcept { return (a + 6755399441055744.0) - 6755399441055744.0; }
inline float round_even(float a) noexcept { return (a + 12582912.0F) - 12582912.0F; }

/// angle - turns * pi with pi in parts, the first so short that its product is exact.
template <class S>
inline S less_turns(const S& angle, const S& turns) noexcept {
  using C = Constant<S>;
  if constexpr (sizeof(C) == sizeof(float)) {
    return ((angle - turns * C(3.140625)) - turns * C(9.67502593994140625e-4)) -
           turns * C(1.5099579909783e-7);
  } else {
    return (angle - turns * C(3.14159265346825122834)) - turns * C(1.21542010130123844986e-10);
  }
}

template <class S>
struct SinCos {
  S sin;
  S cos;
};

/// Sine and cosine by reduction to half a turn about zero and the Taylor series, without a branch. Absolute
/// error under 3e-16 for |angle| < 100 in double: the first left-out terms are (pi/2)^23/23! = 1.3e-18 and
/// (pi/2)^22/22! = 1.9e-17.
template <class S>
inline SinCos<S> sin_cos(const S& angle) noexcept {
  using C = Constant<S>;
  const S turns = round_even(angle * C(0.31830988618379067154));
  const S r = less_turns<S>(angle, turns);
  const S odd = abs(turns - round_even(turns * C(0.5)) * C(2));
  const S sign = C(1) - odd * C(2);
  const S x = r * r;
  S s = C(1.9572941063391263e-20) * x - C(8.2206352466243297e-18);
  s = s * x + C(2.8114572543455206e-15);
  s = s * x - C(7.6471637318198164e-13);
  s = s * x + C(1.6059043836821613e-10);
  s = s * x - C(2.5052108385441720e-08);
  s = s * x + C(2.7557319223985893e-06);
  s = s * x - C(1.9841269841269841e-04);
  s = s * x + C(8.3333333333333332e-03);
  s = s * x - C(1.6666666666666666e-01);
  S c = C(4.1103176233121648e-19) * x - C(1.5619206968586225e-16);
  c = c * x + C(4.7794773323873853e-14);
  c = c * x - C(1.1470745597729725e-11);
  c = c * x + C(2.0876756987868100e-09);
  c = c * x - C(2.7557319223985888e-07);
  c = c * x + C(2.4801587301587302e-05);
  c = c * x - C(1.3888888888888889e-03);
  c = c * x + C(4.1666666666666664e-02);
  c = c * x - C(0.5);
  return {sign * (r + r * x * s), sign * (c * x + C(1))};
}

}  // namespace pastern::stub
