// What gcc's vector extensions leave out, for raw vectors of one register or several: square root, rounding,
// least and most, comparison and choice by mask. Private to lanes.h.
#pragma once

#ifndef PASTERN_LANES_SET
#error "compile lanes with -DPASTERN_LANES_SET=avx512, avx2, neon or plain (tools/packed/CMakeLists.txt)"
#endif

#include <array>
#include <bit>
#include <cmath>
#include <cstddef>
#include <cstdint>
#include <limits>
#include <type_traits>

#if defined(__x86_64__)
#include <immintrin.h>
#elif defined(__aarch64__)
#include <arm_neon.h>
#endif

// Inlined always, so that lanes stay in registers. A sanitizer would instrument such functions for minutes.
#if defined(__SANITIZE_ADDRESS__) || defined(__SANITIZE_THREAD__)
#define PASTERN_LANES_ALWAYS
#else
#define PASTERN_LANES_ALWAYS [[gnu::always_inline]]
#endif
#define PASTERN_LANES_INLINE PASTERN_LANES_ALWAYS [[nodiscard]] inline

namespace pastern::packed::PASTERN_LANES_SET {

#if defined(__AVX512F__) && defined(__AVX512VL__) && defined(__AVX512DQ__) && defined(__AVX512BW__)
#define PASTERN_LANES_BITS 1
inline constexpr int kRegisterBytes = 64;
#elif defined(__AVX2__)
#define PASTERN_LANES_BITS 0
inline constexpr int kRegisterBytes = 32;
#else
#define PASTERN_LANES_BITS 0
inline constexpr int kRegisterBytes = 16;
#endif

/// N numbers of T as gcc sees them, and whole numbers of the same size.
template <class T, int N>
struct Raw {
  using Whole = std::conditional_t<sizeof(T) == 4, std::int32_t, std::int64_t>;
  using Vector [[gnu::vector_size(N * sizeof(T))]] = T;
  using Bits [[gnu::vector_size(N * sizeof(T))]] = Whole;
};

/// f on each piece of a register's size.
template <class Piece, class V, class F>
PASTERN_LANES_INLINE V by_pieces(const V& a, F f) noexcept {
  if constexpr (sizeof(V) <= sizeof(Piece)) {
    return std::bit_cast<V>(f(std::bit_cast<Piece>(a)));
  } else {
    struct Pieces {
      Piece piece[sizeof(V) / sizeof(Piece)];
    };
    auto pieces = std::bit_cast<Pieces>(a);
    for (Piece& piece : pieces.piece) piece = f(piece);
    return std::bit_cast<V>(pieces);
  }
}

#if defined(__x86_64__)
template <class T, int N>
PASTERN_LANES_INLINE auto raw_sqrt(const typename Raw<T, N>::Vector& a) noexcept {
  using V [[maybe_unused]] = typename Raw<T, N>::Vector;
  constexpr bool single = sizeof(T) == 4;
#if defined(__AVX512F__)
  if constexpr (sizeof(V) == 64 && single) return V(_mm512_sqrt_ps(a));
  if constexpr (sizeof(V) == 64 && !single) return V(_mm512_sqrt_pd(a));
#endif
#if defined(__AVX2__)
  if constexpr (sizeof(V) >= 32 && single) {
    return by_pieces<__m256>(a, [](__m256 p) { return _mm256_sqrt_ps(p); });
  }
  if constexpr (sizeof(V) >= 32 && !single) {
    return by_pieces<__m256d>(a, [](__m256d p) { return _mm256_sqrt_pd(p); });
  }
#endif
  if constexpr (single) return by_pieces<__m128>(a, [](__m128 p) { return _mm_sqrt_ps(p); });
  if constexpr (!single) return by_pieces<__m128d>(a, [](__m128d p) { return _mm_sqrt_pd(p); });
}
#elif defined(__aarch64__)
template <class T, int N>
PASTERN_LANES_INLINE auto raw_sqrt(const typename Raw<T, N>::Vector& a) noexcept {
  if constexpr (sizeof(T) == 4) return by_pieces<float32x4_t>(a, [](float32x4_t p) { return vsqrtq_f32(p); });
  if constexpr (sizeof(T) == 8) return by_pieces<float64x2_t>(a, [](float64x2_t p) { return vsqrtq_f64(p); });
}
#else
template <class T, int N>
PASTERN_LANES_INLINE auto raw_sqrt(const typename Raw<T, N>::Vector& a) noexcept {
  typename Raw<T, N>::Vector root = a;
  for (int i = 0; i < N; ++i) root[i] = std::sqrt(a[i]);
  return root;
}
#endif

#if PASTERN_LANES_BITS
/// One bit a lane: what AVX-512 compares into.
template <int N>
using MaskBits = std::conditional_t<(N > 8), __mmask16, __mmask8>;

template <int kHow, class T, int N>
PASTERN_LANES_INLINE MaskBits<N> compare(const typename Raw<T, N>::Vector& a,
                                         const typename Raw<T, N>::Vector& b) noexcept {
  constexpr std::size_t bytes = N * sizeof(T);
  static_assert(bytes == 16 || bytes == 32 || bytes == 64);
  if constexpr (sizeof(T) == 4) {
    if constexpr (bytes == 64) return _mm512_cmp_ps_mask(a, b, kHow);
    if constexpr (bytes == 32) return _mm256_cmp_ps_mask(a, b, kHow);
    if constexpr (bytes == 16) return _mm_cmp_ps_mask(a, b, kHow);
  } else {
    if constexpr (bytes == 64) return _mm512_cmp_pd_mask(a, b, kHow);
    if constexpr (bytes == 32) return _mm256_cmp_pd_mask(a, b, kHow);
    if constexpr (bytes == 16) return _mm_cmp_pd_mask(a, b, kHow);
  }
}

template <class T, int N>
PASTERN_LANES_INLINE auto choose(MaskBits<N> mask, const typename Raw<T, N>::Vector& yes,
                                 const typename Raw<T, N>::Vector& no) noexcept {
  using V = typename Raw<T, N>::Vector;
  if constexpr (sizeof(T) == 4) {
    if constexpr (sizeof(V) == 64) return V(_mm512_mask_blend_ps(mask, no, yes));
    if constexpr (sizeof(V) == 32) return V(_mm256_mask_blend_ps(mask, no, yes));
    if constexpr (sizeof(V) == 16) return V(_mm_mask_blend_ps(mask, no, yes));
  } else {
    if constexpr (sizeof(V) == 64) return V(_mm512_mask_blend_pd(mask, no, yes));
    if constexpr (sizeof(V) == 32) return V(_mm256_mask_blend_pd(mask, no, yes));
    if constexpr (sizeof(V) == 16) return V(_mm_mask_blend_pd(mask, no, yes));
  }
}
#else
/// The sign bit of each number, lowest lane lowest.
template <class T, int N>
PASTERN_LANES_INLINE unsigned sign_bits(const typename Raw<T, N>::Bits& a) noexcept {
  unsigned bits = 0;
#if defined(__x86_64__)
  constexpr unsigned at_once = 16 / sizeof(T);
  struct Pieces {
    __m128 piece[sizeof(a) / 16];
  };
#if defined(__AVX2__)
  if constexpr (sizeof(a) == 32 && sizeof(T) == 4)
    return unsigned(_mm256_movemask_ps(std::bit_cast<__m256>(a)));
  if constexpr (sizeof(a) == 32 && sizeof(T) == 8)
    return unsigned(_mm256_movemask_pd(std::bit_cast<__m256d>(a)));
#endif
  const auto pieces = std::bit_cast<Pieces>(a);
  for (unsigned i = 0; i < sizeof(a) / 16; ++i) {
    const int some = sizeof(T) == 4 ? _mm_movemask_ps(pieces.piece[i])
                                    : _mm_movemask_pd(std::bit_cast<__m128d>(pieces.piece[i]));
    bits |= unsigned(some) << (i * at_once);
  }
#else
  for (int i = 0; i < N; ++i) bits |= (a[i] < 0 ? 1U : 0U) << unsigned(i);
#endif
  return bits;
}
#endif

/// Least of two: b where b < a, else a; an a that is not a number stays, as with std::min.
template <class T, int N>
PASTERN_LANES_INLINE auto raw_min(const typename Raw<T, N>::Vector& a,
                                  const typename Raw<T, N>::Vector& b) noexcept {
  using V = typename Raw<T, N>::Vector;
#if defined(__AVX512F__)
  if constexpr (sizeof(V) == 64 && sizeof(T) == 4) return V(_mm512_min_ps(b, a));
  if constexpr (sizeof(V) == 64 && sizeof(T) == 8) return V(_mm512_min_pd(b, a));
#endif
#if defined(__AVX2__)
  if constexpr (sizeof(V) == 32 && sizeof(T) == 4) return V(_mm256_min_ps(b, a));
  if constexpr (sizeof(V) == 32 && sizeof(T) == 8) return V(_mm256_min_pd(b, a));
#endif
  return V(b < a ? b : a);
}
template <class T, int N>
PASTERN_LANES_INLINE auto raw_max(const typename Raw<T, N>::Vector& a,
                                  const typename Raw<T, N>::Vector& b) noexcept {
  using V = typename Raw<T, N>::Vector;
#if defined(__AVX512F__)
  if constexpr (sizeof(V) == 64 && sizeof(T) == 4) return V(_mm512_max_ps(b, a));
  if constexpr (sizeof(V) == 64 && sizeof(T) == 8) return V(_mm512_max_pd(b, a));
#endif
#if defined(__AVX2__)
  if constexpr (sizeof(V) == 32 && sizeof(T) == 4) return V(_mm256_max_ps(b, a));
  if constexpr (sizeof(V) == 32 && sizeof(T) == 8) return V(_mm256_max_pd(b, a));
#endif
  return V(a < b ? b : a);
}

}  // namespace pastern::packed::PASTERN_LANES_SET
