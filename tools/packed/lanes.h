// N numbers side by side, one robot each: the scalar type of packed walks. Value semantics, trivially
// copyable, uninitialised unless {}. Each set of instructions has a namespace of its own, given by
// PASTERN_LANES_SET, so that nothing made of lanes is shared between translation units of different sets.
// What templates elsewhere ask of a scalar is found here by argument-dependent lookup; functions with more
// behind them stand in functions.h, random numbers in random.h.
#pragma once

#include "tools/packed/registers.h"

#define PASTERN_LANES_FRIEND PASTERN_LANES_ALWAYS friend

namespace pastern::packed::PASTERN_LANES_SET {

/// Yes or no for each of N lanes of T.
template <class T, int N>
struct Mask {
  static constexpr unsigned kAll = (1U << unsigned{N}) - 1U;
#if PASTERN_LANES_BITS
  using Bits = MaskBits<N>;
#else
  using Bits = typename Raw<T, N>::Bits;
#endif
  Bits v;

  /// Lane i has bit i.
  PASTERN_LANES_ALWAYS static Mask of(unsigned bits) noexcept {
#if PASTERN_LANES_BITS
    return {static_cast<Bits>(bits)};
#else
    Mask mask{};
    for (int i = 0; i < N; ++i) mask.v[i] = ((bits >> unsigned(i)) & 1U) != 0 ? -1 : 0;
    return mask;
#endif
  }
  PASTERN_LANES_FRIEND unsigned bits_of(const Mask& a) noexcept {
#if PASTERN_LANES_BITS
    return unsigned{a.v} & kAll;
#else
    return sign_bits<T, N>(a.v);
#endif
  }
  PASTERN_LANES_ALWAYS bool operator[](int lane) const noexcept {
#if PASTERN_LANES_BITS
    return ((unsigned{v} >> unsigned(lane)) & 1U) != 0;
#else
    return v[lane] != 0;
#endif
  }
  PASTERN_LANES_FRIEND Mask operator&(const Mask& a, const Mask& b) noexcept {
    return {static_cast<Bits>(a.v & b.v)};
  }
  PASTERN_LANES_FRIEND Mask operator|(const Mask& a, const Mask& b) noexcept {
    return {static_cast<Bits>(a.v | b.v)};
  }
  PASTERN_LANES_FRIEND Mask operator^(const Mask& a, const Mask& b) noexcept {
    return {static_cast<Bits>(a.v ^ b.v)};
  }
  PASTERN_LANES_FRIEND Mask operator!(const Mask& a) noexcept { return {static_cast<Bits>(~a.v)}; }
  PASTERN_LANES_FRIEND bool any(const Mask& a) noexcept { return bits_of(a) != 0; }
  PASTERN_LANES_FRIEND bool all(const Mask& a) noexcept { return bits_of(a) == kAll; }
  PASTERN_LANES_FRIEND int count(const Mask& a) noexcept { return std::popcount(bits_of(a)); }
};

/// N numbers of T = float or double.
template <class T, int N>
class Lanes {
 public:
  using Constant = T;
  using Vector = typename Raw<T, N>::Vector;
  using Bits = typename Raw<T, N>::Bits;
  using Yes = Mask<T, N>;
  static constexpr int kLanes = N;

  Vector v;

  Lanes() = default;
  /// The same in all lanes; a Constant mixes with lanes as it is, any other number when asked.
  PASTERN_LANES_ALWAYS Lanes(T a) noexcept : v(a - Vector{}) {}  // NOLINT(google-explicit-constructor)
  template <class A>
  requires(std::is_arithmetic_v<A> && !std::is_same_v<A, T>) PASTERN_LANES_ALWAYS explicit Lanes(A a) noexcept
      : Lanes(static_cast<T>(a)) {}
  PASTERN_LANES_ALWAYS explicit Lanes(const Vector& a) noexcept : v(a) {}

  /// Lane by lane from memory and to it.
  PASTERN_LANES_ALWAYS static Lanes of(const std::array<T, N>& a) noexcept {
    return Lanes(std::bit_cast<Vector>(a));
  }
  PASTERN_LANES_FRIEND std::array<T, N> each_of(const Lanes& a) noexcept {
    return std::bit_cast<std::array<T, N>>(a.v);
  }
  PASTERN_LANES_ALWAYS T operator[](int lane) const noexcept { return v[lane]; }
  PASTERN_LANES_ALWAYS void put(int lane, T a) noexcept { v[lane] = a; }

  PASTERN_LANES_FRIEND Lanes operator+(const Lanes& a, const Lanes& b) noexcept { return Lanes(a.v + b.v); }
  PASTERN_LANES_FRIEND Lanes operator-(const Lanes& a, const Lanes& b) noexcept { return Lanes(a.v - b.v); }
  PASTERN_LANES_FRIEND Lanes operator*(const Lanes& a, const Lanes& b) noexcept { return Lanes(a.v * b.v); }
  PASTERN_LANES_FRIEND Lanes operator/(const Lanes& a, const Lanes& b) noexcept { return Lanes(a.v / b.v); }
  PASTERN_LANES_FRIEND Lanes operator-(const Lanes& a) noexcept { return Lanes(-a.v); }
  PASTERN_LANES_ALWAYS Lanes& operator+=(const Lanes& a) noexcept { return *this = *this + a; }
  PASTERN_LANES_ALWAYS Lanes& operator-=(const Lanes& a) noexcept { return *this = *this - a; }
  PASTERN_LANES_ALWAYS Lanes& operator*=(const Lanes& a) noexcept { return *this = *this * a; }
  PASTERN_LANES_ALWAYS Lanes& operator/=(const Lanes& a) noexcept { return *this = *this / a; }

#if PASTERN_LANES_BITS
  PASTERN_LANES_FRIEND Yes operator<(const Lanes& a, const Lanes& b) noexcept {
    return {compare<_CMP_LT_OQ, T, N>(a.v, b.v)};
  }
  PASTERN_LANES_FRIEND Yes operator<=(const Lanes& a, const Lanes& b) noexcept {
    return {compare<_CMP_LE_OQ, T, N>(a.v, b.v)};
  }
  PASTERN_LANES_FRIEND Yes operator==(const Lanes& a, const Lanes& b) noexcept {
    return {compare<_CMP_EQ_OQ, T, N>(a.v, b.v)};
  }
  PASTERN_LANES_FRIEND Yes operator!=(const Lanes& a, const Lanes& b) noexcept {
    return {compare<_CMP_NEQ_UQ, T, N>(a.v, b.v)};
  }
  PASTERN_LANES_FRIEND Lanes select(const Yes& mask, const Lanes& yes, const Lanes& no) noexcept {
    return Lanes(choose<T, N>(mask.v, yes.v, no.v));
  }
#else
  PASTERN_LANES_FRIEND Yes operator<(const Lanes& a, const Lanes& b) noexcept { return {a.v < b.v}; }
  PASTERN_LANES_FRIEND Yes operator<=(const Lanes& a, const Lanes& b) noexcept { return {a.v <= b.v}; }
  PASTERN_LANES_FRIEND Yes operator==(const Lanes& a, const Lanes& b) noexcept { return {a.v == b.v}; }
  PASTERN_LANES_FRIEND Yes operator!=(const Lanes& a, const Lanes& b) noexcept { return {a.v != b.v}; }
  PASTERN_LANES_FRIEND Lanes select(const Yes& mask, const Lanes& yes, const Lanes& no) noexcept {
    return Lanes(Vector(mask.v ? yes.v : no.v));
  }
#endif
  PASTERN_LANES_FRIEND Yes operator>(const Lanes& a, const Lanes& b) noexcept { return b < a; }
  PASTERN_LANES_FRIEND Yes operator>=(const Lanes& a, const Lanes& b) noexcept { return b <= a; }

  /// As std::min and std::max: the first stays when the comparison fails, so what is not a number stays so.
  PASTERN_LANES_FRIEND Lanes min(const Lanes& a, const Lanes& b) noexcept {
    return Lanes(raw_min<T, N>(a.v, b.v));
  }
  PASTERN_LANES_FRIEND Lanes max(const Lanes& a, const Lanes& b) noexcept {
    return Lanes(raw_max<T, N>(a.v, b.v));
  }
  PASTERN_LANES_FRIEND Lanes abs(const Lanes& a) noexcept {
    return Lanes(Vector(Bits(a.v) & std::numeric_limits<typename Raw<T, N>::Whole>::max()));
  }
  PASTERN_LANES_FRIEND Lanes sqrt(const Lanes& a) noexcept { return Lanes(raw_sqrt<T, N>(a.v)); }
  /// Nearest whole number, ties to even, for |a| < 2^51 (2^22 in float), as hal_stub/dynamics/scalar.h has
  /// it.
  PASTERN_LANES_FRIEND Lanes round_even(const Lanes& a) noexcept {
    constexpr T shift = sizeof(T) == 4 ? T(12582912) : T(6755399441055744);
    return Lanes((a.v + shift) - shift);
  }
  /// Sum over the lanes, halves added to halves.
  PASTERN_LANES_FRIEND T sum(const Lanes& a) noexcept {
    T part[N];
    for (int i = 0; i < N; ++i) part[i] = a.v[i];
    for (int half = N / 2; half > 0; half /= 2) {
      for (int i = 0; i < half; ++i) part[i] += part[i + half];
    }
    return part[0];
  }
};

/// Lanes that fill one register of this set.
inline constexpr int kFloatLanes = kRegisterBytes / 4;
inline constexpr int kDoubleLanes = kRegisterBytes / 8;
using Floats = Lanes<float, kFloatLanes>;
using Doubles = Lanes<double, kDoubleLanes>;

/// Each lane as T.
template <class T, class S, int N>
PASTERN_LANES_INLINE Lanes<T, N> lanes_as(const Lanes<S, N>& a) noexcept {
  return Lanes<T, N>(__builtin_convertvector(a.v, typename Raw<T, N>::Vector));
}
/// a where the lane's bit is set, b elsewhere, of masks of another number type.
template <class T, class S, int N>
PASTERN_LANES_INLINE Mask<T, N> mask_as(const Mask<S, N>& a) noexcept {
#if PASTERN_LANES_BITS
  return {a.v};
#else
  return {__builtin_convertvector(a.v, typename Raw<T, N>::Bits)};
#endif
}

/// How many lanes are outside [low, high]; NaN is not counted (runtime/policy/policy_parts.h).
template <class T, int N>
PASTERN_LANES_INLINE int count_outside(const Lanes<T, N>& value, const Lanes<T, N>& low,
                                       const Lanes<T, N>& high) noexcept {
  return count((value < low) | (value > high));
}

}  // namespace pastern::packed::PASTERN_LANES_SET
