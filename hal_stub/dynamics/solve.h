// Block-arrow elimination: each leg's small block is factored (L D L'), its Schur complement taken from the
// trunk's 6x6, which is factored in turn; then the legs' accelerations follow. No pivots: the matrix is
// positive definite.
#pragma once

#include "hal_stub/dynamics/limb.h"

namespace pastern::stub {

/// H = L D L' in place (unit L below the diagonal); `forward` becomes L^-1 [coupling], `force` L^-1 force.
/// For K = 0 the block has `count` rows.
template <int K, class S>
inline void eliminate_leg(LegWork<S>& leg, Work<S>& work, int count = K) noexcept {
  const int rows = K > 0 ? K : count;
  for (int i = 0; i < rows; ++i) {
    const auto n = static_cast<std::size_t>(i);
    leg.forward[i][0] = leg.turning[n].x;
    leg.forward[i][1] = leg.turning[n].y;
    leg.forward[i][2] = leg.turning[n].z;
    leg.forward[i][3] = leg.moving[n].x;
    leg.forward[i][4] = leg.moving[n].y;
    leg.forward[i][5] = leg.moving[n].z;
    for (int j = 0; j < i; ++j) {
      S e = leg.inertia[i][j];
      for (int k = 0; k < j; ++k) e = e - leg.inertia[i][k] * leg.inertia[j][k];
      leg.inertia[i][j] = e;  // l_ij d_j for now
    }
    S d = leg.inertia[i][i];
    for (int j = 0; j < i; ++j) {
      const S l = leg.inertia[i][j] * leg.inverse[static_cast<std::size_t>(j)];
      d = d - l * leg.inertia[i][j];
      leg.inertia[i][j] = l;
      for (int c = 0; c < 6; ++c) leg.forward[i][c] = leg.forward[i][c] - l * leg.forward[j][c];
      leg.force[n] = leg.force[n] - l * leg.force[static_cast<std::size_t>(j)];
    }
    leg.inverse[n] = Constant<S>(1) / d;
    for (int a = 0; a < 6; ++a) {
      const S scaled = leg.forward[i][a] * leg.inverse[n];
      for (int b = 0; b <= a; ++b) work.inertia[a][b] = work.inertia[a][b] - scaled * leg.forward[i][b];
      work.force[a] = work.force[a] - scaled * leg.force[n];
    }
  }
}

/// Solves the trunk's 6x6 for its acceleration; the matrix is overwritten.
template <class S>
inline void solve_trunk(Work<S>& work) noexcept {
  auto& a = work.inertia;
  S inverse[6];
  S x[6];
  for (int i = 0; i < 6; ++i) {
    x[i] = work.force[i];
    for (int j = 0; j < i; ++j) {
      S e = a[i][j];
      for (int k = 0; k < j; ++k) e = e - a[i][k] * a[j][k];
      a[i][j] = e;
    }
    S d = a[i][i];
    for (int j = 0; j < i; ++j) {
      const S l = a[i][j] * inverse[j];
      d = d - l * a[i][j];
      a[i][j] = l;
      x[i] = x[i] - l * x[j];
    }
    inverse[i] = Constant<S>(1) / d;
  }
  for (int i = 5; i >= 0; --i) {
    x[i] = x[i] * inverse[i];
    for (int k = i + 1; k < 6; ++k) x[i] = x[i] - a[k][i] * x[k];
    work.acceleration[i] = x[i];
  }
}

template <int K, class S>
inline void follow_leg(LegWork<S>& leg, const S* trunk, int count = K) noexcept {
  const int rows = K > 0 ? K : count;
  for (int i = rows - 1; i >= 0; --i) {
    const auto n = static_cast<std::size_t>(i);
    S x = leg.force[n];
    for (int c = 0; c < 6; ++c) x = x - leg.forward[i][c] * trunk[c];
    x = x * leg.inverse[n];
    for (int k = i + 1; k < rows; ++k)
      x = x - leg.inertia[k][i] * leg.acceleration[static_cast<std::size_t>(k)];
    leg.acceleration[n] = x;
  }
}

/// Accelerations of trunk and joints from the matrix and right-hand side in `work`, which are used up.
template <class S>
inline void solve(const Tree<Constant<S>>& tree, Work<S>& work) noexcept {
  for (int l = 0; l < tree.leg_count; ++l) {
    const auto n = static_cast<std::size_t>(l);
    const auto& leg = tree.leg[n];
    for_limb(leg, [&]<int K>() { eliminate_leg<K>(work.leg[n], work, leg.joint_count); });
  }
  solve_trunk(work);
  for (int l = 0; l < tree.leg_count; ++l) {
    const auto n = static_cast<std::size_t>(l);
    const auto& leg = tree.leg[n];
    for_limb(leg, [&]<int K>() { follow_leg<K>(work.leg[n], work.acceleration, leg.joint_count); });
  }
}

}  // namespace pastern::stub
