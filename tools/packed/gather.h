// Whole numbers of lanes beyond random.h, and one number for each lane from a place of its own.
#pragma once

#include "tools/packed/random.h"

namespace pastern::packed::PASTERN_LANES_SET {

template <int N>
PASTERN_LANES_INLINE Words<N> operator-(const Words<N>& a, const Words<N>& b) noexcept {
  return Words<N>(a.v - b.v);
}
template <int N>
PASTERN_LANES_INLINE Words<N> least(const Words<N>& a, const Words<N>& b) noexcept {
  return Words<N>(a.v < b.v ? a.v : b.v);
}
/// 1 where the upper bit is not set, else 0.
template <class T, int N>
PASTERN_LANES_INLINE Lanes<T, N> not_negative(const Words<N>& a) noexcept {
  return number_of<T>((a >> 31) ^ Words<N>(1));
}

/// Place of lane i's number in a ring of rows (a power of two of them) by tick, in a row `width` numbers a
/// lane, the first of them.
template <int N>
PASTERN_LANES_INLINE Words<N> place_in_ring(const Words<N>& tick, std::uint32_t rows,
                                            std::size_t width) noexcept {
  typename Words<N>::Vector lane;
  for (int i = 0; i < N; ++i) lane[i] = static_cast<std::uint32_t>(i);
  return Words<N>((tick.v & (rows - 1)) * static_cast<std::uint32_t>(width * N) + lane);
}

/// from[at[lane]] for each lane.
template <class T, int N>
PASTERN_LANES_INLINE Lanes<T, N> gathered(const T* from, const Words<N>& at) noexcept {
  using L = Lanes<T, N>;
#if defined(__AVX512F__)
  if constexpr (sizeof(T) == 4 && N == 16) {
    return L(typename L::Vector(_mm512_i32gather_ps((__m512i)at.v, from, 4)));
  }
  if constexpr (sizeof(T) == 8 && N == 8) {
    return L(typename L::Vector(_mm512_i32gather_pd((__m256i)at.v, from, 8)));
  }
#endif
#if defined(__AVX2__)
  if constexpr (sizeof(T) == 4 && N == 8) {
    return L(typename L::Vector(_mm256_i32gather_ps(from, (__m256i)at.v, 4)));
  }
#endif
  L made;
  for (int i = 0; i < N; ++i) made.v[i] = from[at.v[i]];
  return made;
}

}  // namespace pastern::packed::PASTERN_LANES_SET
