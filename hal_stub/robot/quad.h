// Four doubles side by side: the four legs of a robot in one register, or in two where registers are
// narrower. Private to advance.cpp, where everything is inlined into one function for each kind of machine.
#pragma once

#include "hal_stub/dynamics/scalar.h"

namespace pastern::stub {

struct QuadMask {
  using Bits [[gnu::vector_size(32)]] = long long;
  Bits v;
};

struct Quad {
  using Lanes [[gnu::vector_size(32)]] = double;
  Lanes v{};

  Quad() = default;
  Quad(double a)
      : v{a, a, a, a} {}  // NOLINT(google-explicit-constructor): a number stands for four equal ones
  explicit Quad(Lanes lanes) : v(lanes) {}
  Quad(double a, double b, double c, double d) : v{a, b, c, d} {}
};

template <>
struct ScalarTraits<Quad> {
  using Constant = Quad;
};

inline Quad operator+(const Quad& a, const Quad& b) noexcept { return Quad(a.v + b.v); }
inline Quad operator-(const Quad& a, const Quad& b) noexcept { return Quad(a.v - b.v); }
inline Quad operator*(const Quad& a, const Quad& b) noexcept { return Quad(a.v * b.v); }
inline Quad operator/(const Quad& a, const Quad& b) noexcept { return Quad(a.v / b.v); }
inline QuadMask operator<(const Quad& a, const Quad& b) noexcept { return {a.v < b.v}; }
inline QuadMask operator>(const Quad& a, const Quad& b) noexcept { return {a.v > b.v}; }
inline QuadMask operator&(const QuadMask& a, const QuadMask& b) noexcept { return {a.v & b.v}; }
inline QuadMask operator|(const QuadMask& a, const QuadMask& b) noexcept { return {a.v | b.v}; }
inline QuadMask operator!(const QuadMask& a) noexcept { return {~a.v}; }
inline Quad select(const QuadMask& mask, const Quad& yes, const Quad& no) noexcept {
  return Quad(mask.v ? yes.v : no.v);
}
inline bool any(const QuadMask& mask) noexcept {
  return (mask.v[0] | mask.v[1] | mask.v[2] | mask.v[3]) != 0;
}
inline Quad min(const Quad& a, const Quad& b) noexcept { return Quad(a.v < b.v ? a.v : b.v); }
inline Quad max(const Quad& a, const Quad& b) noexcept { return Quad(a.v > b.v ? a.v : b.v); }
inline Quad abs(const Quad& a) noexcept { return Quad(a.v < 0 ? -a.v : a.v); }
inline Quad sqrt(const Quad& a) noexcept {
  return {std::sqrt(a.v[0]), std::sqrt(a.v[1]), std::sqrt(a.v[2]), std::sqrt(a.v[3])};
}
inline Quad round_even(const Quad& a) noexcept {
  return Quad((a.v + 6755399441055744.0) - 6755399441055744.0);
}
inline double sum(const Quad& a) noexcept { return (a.v[0] + a.v[2]) + (a.v[1] + a.v[3]); }

}  // namespace pastern::stub
