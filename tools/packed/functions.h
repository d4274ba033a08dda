// Elementary functions of lanes, without a branch. Polynomials: minimax fits by exchange (Remez) of relative
// error, computed for this file to 60 digits and rounded; ranges beside them. Errors against the function in
// higher precision, in units of the last place of the result, are stated with each and tested. All give NaN
// for NaN.
#pragma once

#include "hal_stub/dynamics/scalar.h"
#include "tools/packed/lanes.h"

namespace pastern::packed::PASTERN_LANES_SET {

template <class T>
inline constexpr bool kSingle = sizeof(T) == 4;

/// c0 + c1 x + c2 x^2 + ..., Horner.
template <class T, int N>
PASTERN_LANES_INLINE Lanes<T, N> series(const Lanes<T, N>&, double last) noexcept {
  return Lanes<T, N>(last);
}
template <class T, int N, class... More>
PASTERN_LANES_INLINE Lanes<T, N> series(const Lanes<T, N>& x, double c0, double c1, More... more) noexcept {
  return series(x, c1, more...) * x + static_cast<T>(c0);
}

/// Fits of the single functions; x is the argument or its square as named.
template <class T, int N>
PASTERN_LANES_INLINE Lanes<T, N> exp_fit(const Lanes<T, N>& x) noexcept {  // (e^x - 1 - x)/x^2, |x| < ln2/2
  if constexpr (kSingle<T>) {
    return series(x, 0.500000006, 0.16666543, 0.0416662823, 0.00836658534, 0.0013946434);
  } else {
    return series(x, 0.500000000000000555, 0.166666666666666861, 0.0416666666665736224,
                  0.00833333333331454725, 0.00138888889323802842, 0.000198412699031134391,
                  0.0000248015044438682435, 2.75572278890804141e-6, 2.76263273980314444e-7,
                  2.51144913108767748e-8);
  }
}
template <class T, int N>
PASTERN_LANES_INLINE Lanes<T, N> log_fit(
    const Lanes<T, N>& z) noexcept {  // (2 atanh(s)/s - 2)/s^2, s < .1716
  if constexpr (kSingle<T>) {
    return series(z, 0.666666656, 0.400003409, 0.285369206, 0.235899675);
  } else {
    return series(z, 0.666666666666673462, 0.399999999994131496, 0.285714287427626209, 0.222221985313781889,
                  0.181835666614523368, 0.15313986852642779, 0.147966248193225811);
  }
}
template <class T, int N>
PASTERN_LANES_INLINE Lanes<T, N> asin_fit(const Lanes<T, N>& z) noexcept {  // (asin(x)/x - 1)/x^2, x <= 1/2
  if constexpr (kSingle<T>) {
    return series(z, 0.166667541, 0.074952329, 0.0454783072, 0.0241411767, 0.0422302328);
  } else {
    return series(z, 0.166666666666653757, 0.0750000000034481463, 0.0446428568219600685,
                  0.0303819593961627325, 0.0223717519222954583, 0.0173597958557924894, 0.0138843485124774709,
                  0.0121749543040751889, 0.00650347077540712229, 0.0195944704766446057,
                  -0.0163268858201116893, 0.0319818148385359512);
  }
}
template <class T, int N>
PASTERN_LANES_INLINE Lanes<T, N> atan_fit(
    const Lanes<T, N>& z) noexcept {  // (atan(x)/x - 1)/x^2, x < tan(pi/8)
  if constexpr (kSingle<T>) {
    return series(z, -0.333333154, 0.199984823, -0.142437036, 0.105948642, -0.0608041986);
  } else {
    return series(z, -0.333333333333331973, 0.19999999999953523, -0.142857142801893323, 0.111111107830511875,
                  -0.0909089774436916433, 0.0769205994535851046, -0.0666310059120879983,
                  0.0584786111233462006, -0.0503916363680392989, 0.0380606184209694213,
                  -0.0179025034671572941);
  }
}

/// What is done to the bits of a number.
template <class T>
struct Pattern {
  static constexpr int kFraction = kSingle<T> ? 23 : 52;
  static constexpr int kBias = kSingle<T> ? 127 : 1023;
  static constexpr T kShift = kSingle<T> ? T(12582912) : T(6755399441055744);  ///< 1.5 * 2^kFraction
  using Whole = typename Raw<T, 1>::Whole;
  static constexpr Whole kSign = std::numeric_limits<Whole>::min();
};

/// Magnitude of a, sign of b.
template <class T, int N>
PASTERN_LANES_INLINE Lanes<T, N> copysign(const Lanes<T, N>& a, const Lanes<T, N>& b) noexcept {
  using L = Lanes<T, N>;
  using B = typename L::Bits;
  constexpr auto sign = Pattern<T>::kSign;
  return L(typename L::Vector((B(a.v) & ~sign) | (B(b.v) & sign)));
}

/// Largest whole number that is not above a.
template <class T, int N>
PASTERN_LANES_INLINE Lanes<T, N> floor(const Lanes<T, N>& a) noexcept {
  using L = Lanes<T, N>;
  constexpr T large = kSingle<T> ? T(8388608) : T(4503599627370496);  // all numbers from here on are whole
  const L size = abs(a);
  const L near = copysign(L((size.v + large) - large), a);
  const L below = near - select(near > a, L(T(1)), L(T(0)));
  return select(size < L(large), copysign(below, a), a);
}

/// 2^n for whole n in the range of normal numbers.
template <class T, int N>
PASTERN_LANES_INLINE Lanes<T, N> power_of_two(const Lanes<T, N>& n) noexcept {
  using L = Lanes<T, N>;
  using P = Pattern<T>;
  // The low bits of the shifted number are n + bias; the rest is pushed out.
  const L shifted = (n + T(P::kBias)) + P::kShift;
  return L(typename L::Vector(typename L::Bits(shifted.v) << P::kFraction));
}

/// x = n ln 2 + r, |r| <= ln 2 / 2, by two parts of ln 2, the first so short that its product is exact (Cody
/// and Waite, Software Manual for the Elementary Functions, 1980).
template <class T, int N>
struct LessPowers {
  Lanes<T, N> n;
  Lanes<T, N> r;
};
template <class T, int N>
PASTERN_LANES_INLINE LessPowers<T, N> less_powers(const Lanes<T, N>& x) noexcept {
  const Lanes<T, N> n = round_even(x * T(1.4426950408889634074));
  if constexpr (kSingle<T>) return {n, (x - n * T(0.693359375)) - n * T(-2.12194440054690583e-4)};
  return {n, (x - n * T(6.93147180369123816490e-01)) - n * T(1.90821492927058770002e-10)};
}

/// Within 2 units of the last place; gradual below the normal numbers.
template <class T, int N>
PASTERN_LANES_INLINE Lanes<T, N> exp(const Lanes<T, N>& x) noexcept {
  using L = Lanes<T, N>;
  constexpr T most = kSingle<T> ? T(89) : T(710);
  constexpr T least = kSingle<T> ? T(-104) : T(-746);
  const auto [n, r] = less_powers(max(min(x, L(most)), L(least)));
  const L half = round_even(n * T(0.5));
  const L value = (r * r * exp_fit(r) + r) + T(1);
  return (value * power_of_two(half)) * power_of_two(n - half);
}

/// Within 3 units of the last place.
template <class T, int N>
PASTERN_LANES_INLINE Lanes<T, N> tanh(const Lanes<T, N>& x) noexcept {
  using L = Lanes<T, N>;
  const auto [n, r] = less_powers(min(abs(x) * T(2), L(kSingle<T> ? T(20) : T(44))));
  const L scale = power_of_two(n);
  const L less_one = (r * r * exp_fit(r) + r) * scale + (scale - T(1));  // e^2|x| - 1
  return copysign(less_one / (less_one + T(2)), x);
}

/// Within 2 units of the last place; -inf at 0, NaN below.
template <class T, int N>
PASTERN_LANES_INLINE Lanes<T, N> log(const Lanes<T, N>& a) noexcept {
  using L = Lanes<T, N>;
  using P = Pattern<T>;
  using B = typename L::Bits;
  using W = typename P::Whole;
  constexpr T huge = std::numeric_limits<T>::infinity();
  const auto tiny = a < L(std::numeric_limits<T>::min());
  const L x = select(tiny, a * T(W{1} << P::kFraction), a);
  // x = 2^e m, m in [sqrt(1/2), sqrt(2)): the bits above those of sqrt(1/2) count.
  constexpr W root_half = kSingle<T> ? W(0x3f3504f3) : W(0x3fe6a09e667f3bcd);
  const B above = B(x.v) - root_half;
  const B steps = above >> P::kFraction;
  const L m(typename L::Vector(B(x.v) - (steps << P::kFraction)));
  const W shift_bits = std::bit_cast<W>(P::kShift);
  const L e =
      L(typename L::Vector(steps + shift_bits)) - P::kShift - select(tiny, L(T(P::kFraction)), L(T(0)));
  const L f = m - T(1);
  const L s = f / (f + T(2));
  const L z = s * s;
  const L half_square = f * f * T(0.5);
  const L rest = s * (half_square + z * log_fit(z));
  constexpr T high = kSingle<T> ? T(0.693359375) : T(6.93147180369123816490e-01);
  constexpr T low = kSingle<T> ? T(-2.12194440054690583e-4) : T(1.90821492927058770002e-10);
  const L value = e * high - ((half_square - (rest + e * low)) - f);
  const L edge =
      select(a == L(T(0)), L(-huge), select(a < L(T(0)), L(std::numeric_limits<T>::quiet_NaN()), a));
  return select((a > L(T(0))) & (a < L(huge)), value, edge);
}

inline constexpr double kHalfPi = 1.57079632679489661923;
inline constexpr double kPi = 3.14159265358979323846;
/// What rounding takes from pi/2.
template <class T>
inline constexpr T kHalfPiRest = kSingle<T> ? T(-4.37113900018624283e-8) : T(6.123233995736766036e-17);

/// x of [0, 1] for asin and acos: below 1/2 as it is, above by asin x = pi/2 - 2 asin sqrt((1 - x)/2).
template <class T, int N>
struct Arc {
  Mask<T, N> upper;
  Lanes<T, N> value;  ///< asin x, or asin sqrt((1 - x)/2)
};
template <class T, int N>
PASTERN_LANES_INLINE Arc<T, N> arc(const Lanes<T, N>& size) noexcept {
  const auto upper = !(size <= Lanes<T, N>(T(0.5)));
  const Lanes<T, N> z = select(upper, (T(1) - size) * T(0.5), size * size);
  const Lanes<T, N> root = select(upper, sqrt(z), size);
  return {upper, root + root * (z * asin_fit(z))};
}

/// Within 3 units of the last place; NaN outside [-1, 1].
template <class T, int N>
PASTERN_LANES_INLINE Lanes<T, N> asin(const Lanes<T, N>& x) noexcept {
  using L = Lanes<T, N>;
  const auto [upper, part] = arc(abs(x));
  const L top = L(T(kHalfPi)) - (part * T(2) - kHalfPiRest<T>);
  return copysign(select(upper, top, part), x);
}
template <class T, int N>
PASTERN_LANES_INLINE Lanes<T, N> acos(const Lanes<T, N>& x) noexcept {
  using L = Lanes<T, N>;
  const auto [upper, part] = arc(abs(x));
  const auto negative = x < L(T(0));
  const L middle = L(T(kHalfPi)) - (copysign(part, x) - kHalfPiRest<T>);
  const L twice = part * T(2);
  const L end = select(negative, L(T(kPi)) - (twice - T(2) * kHalfPiRest<T>), twice);
  return select(upper, end, middle);
}

/// Within 3 units of the last place; signs and zeros as std::atan2.
template <class T, int N>
PASTERN_LANES_INLINE Lanes<T, N> atan2(const Lanes<T, N>& y, const Lanes<T, N>& x) noexcept {
  using L = Lanes<T, N>;
  const L up = abs(y);
  const L across = abs(x);
  const auto steep = up > across;
  const L least = select(steep, across, up);
  const L most = select(steep, up, across);
  // Above tan(pi/8): atan t = pi/4 + atan((t - 1)/(t + 1)).
  const auto same = (least == most) & (most > L(T(0)));
  const auto outer = (least > most * T(0.41421356237309504880)) | same;
  const L above = select(same, L(T(0)), select(outer, least - most, least));
  const L below = select(same | (most == L(T(0))), L(T(1)), select(outer, least + most, most));
  const L t = above / below;
  const L z = t * t;
  const L base = select(outer, L(T(kHalfPi / 2)), L(T(0)));
  const L base_rest = select(outer, L(kHalfPiRest<T> / 2), L(T(0)));
  L angle = base + (t + (t * (z * atan_fit(z)) + base_rest));
  angle = select(steep, L(T(kHalfPi)) - (angle - kHalfPiRest<T>), angle);
  const auto behind = copysign(L(T(1)), x) < L(T(0));
  angle = select(behind, L(T(kPi)) - (angle - T(2) * kHalfPiRest<T>), angle);
  return copysign(select((x == x) & (y == y), angle, x + y), y);
}

/// Of float lanes, with the reduction of hal_stub/dynamics/scalar.h and as many terms as float needs:
/// absolute error under 3e-7 for |angle| < 100. Double lanes use the plain source itself.
template <int N>
PASTERN_LANES_INLINE stub::SinCos<Lanes<float, N>> sin_cos(const Lanes<float, N>& angle) noexcept {
  using L = Lanes<float, N>;
  const L turns = round_even(angle * 0.31830988618379067154F);
  const L r = stub::less_turns<L>(angle, turns);
  const L odd = abs(turns - round_even(turns * 0.5F) * 2.0F);
  const L sign = 1.0F - odd * 2.0F;
  const L z = r * r;
  const L s = series(z, -0.166666605, 0.008333088, -0.000198110989, 2.60889903e-6);    // (sin r/r - 1)/r^2
  const L c = series(z, 0.0416666558, -0.00138885689, 2.47692897e-5, -2.61935062e-7);  // of r^4
  return {sign * (r + r * (z * s)), sign * ((z * z) * c + (1.0F - z * 0.5F))};
}
template <class T, int N>
PASTERN_LANES_INLINE Lanes<T, N> sin(const Lanes<T, N>& angle) noexcept {
  using stub::sin_cos;
  return sin_cos(angle).sin;
}
template <class T, int N>
PASTERN_LANES_INLINE Lanes<T, N> cos(const Lanes<T, N>& angle) noexcept {
  using stub::sin_cos;
  return sin_cos(angle).cos;
}

}  // namespace pastern::packed::PASTERN_LANES_SET
