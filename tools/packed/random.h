// Counter-based random numbers by lanes: Philox4x32-10 (Salmon et al., SC 2011), each lane the same number
// as hal_stub/robot/random.h gives for its coordinates.
#pragma once

#include "tools/packed/functions.h"

namespace pastern::packed::PASTERN_LANES_SET {

/// N unsigned 32-bit numbers.
template <int N>
struct Words {
  using Vector = typename Raw<std::uint32_t, N>::Vector;
  using Double = typename Raw<std::uint64_t, N>::Vector;
  Vector v;

  Words() = default;
  PASTERN_LANES_ALWAYS Words(std::uint32_t a) noexcept
      : v(a + Vector{}) {}  // NOLINT(google-explicit-constructor)
  PASTERN_LANES_ALWAYS explicit Words(const Vector& a) noexcept : v(a) {}
  /// Lane by lane from memory.
  PASTERN_LANES_ALWAYS static Words of(const std::array<std::uint32_t, N>& a) noexcept {
    return Words(std::bit_cast<Vector>(a));
  }
  PASTERN_LANES_ALWAYS std::uint32_t operator[](int lane) const noexcept { return v[lane]; }
  PASTERN_LANES_ALWAYS void put(int lane, std::uint32_t a) noexcept { v[lane] = a; }

  PASTERN_LANES_FRIEND Words operator+(const Words& a, const Words& b) noexcept { return Words(a.v + b.v); }
  PASTERN_LANES_FRIEND Words operator^(const Words& a, const Words& b) noexcept { return Words(a.v ^ b.v); }
  PASTERN_LANES_FRIEND Words operator&(const Words& a, const Words& b) noexcept { return Words(a.v & b.v); }
  PASTERN_LANES_FRIEND Words operator|(const Words& a, const Words& b) noexcept { return Words(a.v | b.v); }
  PASTERN_LANES_FRIEND Words operator>>(const Words& a, int bits) noexcept { return Words(a.v >> bits); }
  PASTERN_LANES_FRIEND Words operator<<(const Words& a, int bits) noexcept { return Words(a.v << bits); }
};

/// Both halves of the 64-bit product.
template <int N>
struct Product {
  Words<N> high;
  Words<N> low;
};

#if defined(__x86_64__)
/// Products of the even entries, 64 bits each.
template <class V>
PASTERN_LANES_INLINE V even_products(const V& a, const V& b) noexcept {
#if defined(__AVX512F__)
  if constexpr (sizeof(V) == 64) return V(_mm512_mul_epu32((__m512i)a, (__m512i)b));
#endif
#if defined(__AVX2__)
  if constexpr (sizeof(V) == 32) return V(_mm256_mul_epu32((__m256i)a, (__m256i)b));
#endif
  if constexpr (sizeof(V) == 8) {
    struct Two {
      V half[2];
    };
    const Two two{{a, a}};
    const Two other{{b, b}};
    return std::bit_cast<Two>(_mm_mul_epu32(std::bit_cast<__m128i>(two), std::bit_cast<__m128i>(other)))
        .half[0];
  } else {
    V product{};
    struct Pieces {
      __m128i piece[sizeof(V) / 16];
    };
    auto left = std::bit_cast<Pieces>(a);
    const auto right = std::bit_cast<Pieces>(b);
    for (unsigned i = 0; i < sizeof(V) / 16; ++i)
      left.piece[i] = _mm_mul_epu32(left.piece[i], right.piece[i]);
    product = std::bit_cast<V>(left);
    return product;
  }
}
template <int N>
PASTERN_LANES_INLINE Product<N> product(const Words<N>& a, std::uint32_t b) noexcept {
  using V = typename Words<N>::Vector;
  using Pairs = typename Raw<std::uint64_t, N / 2>::Vector;
  const V other = b + V{};
  const Pairs even = Pairs(even_products<V>(a.v, other));
  const Pairs odd = Pairs(even_products<V>(V(Pairs(a.v) >> 32), other));
  constexpr std::uint64_t upper = 0xffffffff00000000U;
  return {Words<N>(V((even >> 32) | (odd & upper))), Words<N>(V((even & ~upper) | (odd << 32)))};
}
#else
template <int N>
PASTERN_LANES_INLINE Product<N> product(const Words<N>& a, std::uint32_t b) noexcept {
  using V = typename Words<N>::Vector;
  const auto wide = __builtin_convertvector(a.v, typename Words<N>::Double) * std::uint64_t{b};
  return {Words<N>(__builtin_convertvector(wide >> 32, V)), Words<N>(__builtin_convertvector(wide, V))};
}
#endif

template <int N>
using FourWords = std::array<Words<N>, 4>;

/// Ten rounds. Key and counter lowest word first.
template <int N>
PASTERN_LANES_INLINE FourWords<N> philox(FourWords<N> c, Words<N> key0, Words<N> key1) noexcept {
  for (int round = 0; round < 10; ++round) {
    const Product<N> first = product(c[0], 0xD2511F53U);
    const Product<N> second = product(c[2], 0xCD9E8D57U);
    c = {second.high ^ c[1] ^ key0, second.low, first.high ^ c[3] ^ key1, first.low};
    key0 = key0 + Words<N>(0x9E3779B9U);
    key1 = key1 + Words<N>(0xBB67AE85U);
  }
  return c;
}

/// Exact for words below 2^24 (float) or all (double).
template <class T, int N>
PASTERN_LANES_INLINE Lanes<T, N> number_of(const Words<N>& a) noexcept {
  using L = Lanes<T, N>;
  if constexpr (kSingle<T>) {
    return L(__builtin_convertvector(typename L::Bits(a.v), typename L::Vector));
  } else {
    const auto wide = __builtin_convertvector(a.v, typename Words<N>::Double);
    return L(typename L::Vector(wide | 0x4330000000000000U)) - 4503599627370496.0;  // 2^52
  }
}

/// Uniform in (0, 1): double as uniform_of() of the simulated robot; float from the upper 23 bits, so that
/// neither end is met.
template <class T, int N>
PASTERN_LANES_INLINE Lanes<T, N> uniform_of(const Words<N>& a) noexcept {
  if constexpr (kSingle<T>) return (number_of<T>(a >> 9) + 0.5F) * 0x1p-23F;
  if constexpr (!kSingle<T>) return (number_of<T>(a) + 0.5) * 0x1p-32;
}

/// Standard normal of two words (Box and Muller, Ann. Math. Stat. 29(2), 1958).
template <class T, int N>
PASTERN_LANES_INLINE Lanes<T, N> normal_of(const Words<N>& a, const Words<N>& b) noexcept {
  return sqrt(log(uniform_of<T>(a)) * T(-2)) * cos(uniform_of<T>(b) * T(2 * kPi));
}

/// Sum of a word's four bytes, as rough_normal_of() of the simulated robot.
template <class T, int N>
PASTERN_LANES_INLINE Lanes<T, N> rough_normal_of(const Words<N>& a) noexcept {
  const Words<N> pairs = (a & Words<N>(0x00ff00ffU)) + ((a >> 8) & Words<N>(0x00ff00ffU));
  const Words<N> sum = (pairs & Words<N>(0xffffU)) + (pairs >> 16);
  return (number_of<T>(sum) - T(510)) * T(0.0067658751);
}

}  // namespace pastern::packed::PASTERN_LANES_SET
