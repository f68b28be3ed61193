#pragma once

#include <cmath>
#include <cstdint>

#include "kinetics/tape_lanes.hpp"
#include "kinetics/tape_machine.hpp"

namespace stillzone::kinetics {

/// The interpreter of a tape for tiles of `width` lanes, worked through `n` lanes at a time.
/// @tparam Machine see Lanes
template <class Machine, int width, int n>
class TapeKernel {
  using L = Lanes<Machine, n>;
  using Real = typename L::Real;
  using Instruction = TapeInstruction;

 public:
  static void run(const TapeTile& tile) {
    const double* constants = tile.constants;
    double* slots = tile.slots;
    for (const Instruction* i = tile.first; i != tile.last; ++i) {
      double* d = slots + i->d * width;
      const double* a = slots + i->a * width;
      const double* b = slots + i->b * width;
      const double* c = slots + i->c * width;
      const double* k = constants + i->k;
      // clang-format off
      switch (i->op) {
        case TapeOp::load1: load1(*i, tile); break;
        case TapeOp::load4: load4(*i, tile); break;
        case TapeOp::store1: store1(*i, tile); break;
        case TapeOp::store4: store4(*i, tile); break;
        case TapeOp::set: one_k(d, d, k, [](Real, Real z) { return z; }); break;
        case TapeOp::add: two(d, a, b, [](Real x, Real y) { return x + y; }); break;
        case TapeOp::subtract: two(d, a, b, [](Real x, Real y) { return x - y; }); break;
        case TapeOp::multiply: two(d, a, b, [](Real x, Real y) { return x * y; }); break;
        case TapeOp::divide: two(d, a, b, [](Real x, Real y) { return x / y; }); break;
        case TapeOp::negate: one(d, a, [](Real x) { return -x; }); break;
        case TapeOp::reciprocal: one(d, a, [](Real x) { return L::all(1.0) / x; }); break;
        case TapeOp::sqrt: one(d, a, [](Real x) { return L::sqrt(x); }); break;
        case TapeOp::exp: one(d, a, [](Real x) { return L::exp(x); }); break;
        case TapeOp::log: logarithm(d, a); break;
        case TapeOp::power: power(d, a, b); break;
        case TapeOp::minimum: two(d, a, b, [](Real x, Real y) { return L::minimum(x, y); }); break;
        case TapeOp::maximum: two(d, a, b, [](Real x, Real y) { return L::maximum(x, y); }); break;
        case TapeOp::step: one(d, a, [](Real x) { return L::step(x); }); break;
        case TapeOp::add_k: one_k(d, a, k, [](Real x, Real z) { return x + z; }); break;
        case TapeOp::subtract_from_k: one_k(d, a, k, [](Real x, Real z) { return z - x; }); break;
        case TapeOp::multiply_k: one_k(d, a, k, [](Real x, Real z) { return z * x; }); break;
        case TapeOp::divide_k: one_k(d, a, k, [](Real x, Real z) { return z / x; }); break;
        case TapeOp::multiply_add: three(d, a, b, c, [](Real x, Real y, Real z) { return L::multiply_add(x, y, z); }); break;
        case TapeOp::multiply_subtract: three(d, a, b, c, [](Real x, Real y, Real z) { return L::multiply_add(x, y, -z); }); break;
        case TapeOp::subtract_product: three(d, a, b, c, [](Real x, Real y, Real z) { return L::multiply_add(-x, y, z); }); break;
        case TapeOp::multiply_k_add: two_k(d, a, b, k, [](Real x, Real y, Real z) { return L::multiply_add(z, x, y); }); break;
        case TapeOp::multiply_k_subtract: two_k(d, a, b, k, [](Real x, Real y, Real z) { return L::multiply_add(z, x, -y); }); break;
        case TapeOp::multiply_add_k: two_k(d, a, b, k, [](Real x, Real y, Real z) { return L::multiply_add(x, y, z); }); break;
        case TapeOp::k_subtract_product: two_k(d, a, b, k, [](Real x, Real y, Real z) { return L::multiply_add(-x, y, z); }); break;
        default: __builtin_unreachable();  // no range check in front of the jump
      }
      // clang-format on
    }
  }

 private:
  template <class F>
  [[gnu::always_inline]] static inline void one(double* d, const double* a, F f) {
    for (int l = 0; l < width; l += n) L::store(d + l, f(L::load(a + l)));
  }
  template <class F>
  [[gnu::always_inline]] static inline void two(double* d, const double* a, const double* b, F f) {
    for (int l = 0; l < width; l += n) L::store(d + l, f(L::load(a + l), L::load(b + l)));
  }
  template <class F>
  [[gnu::always_inline]] static inline void three(double* d, const double* a, const double* b,
                                                  const double* c, F f) {
    for (int l = 0; l < width; l += n) {
      L::store(d + l, f(L::load(a + l), L::load(b + l), L::load(c + l)));
    }
  }
  template <class F>
  [[gnu::always_inline]] static inline void one_k(double* d, const double* a, const double* k,
                                                  F f) {
    const Real z = L::all(*k);
    for (int l = 0; l < width; l += n) L::store(d + l, f(L::load(a + l), z));
  }
  template <class F>
  [[gnu::always_inline]] static inline void two_k(double* d, const double* a, const double* b,
                                                  const double* k, F f) {
    const Real z = L::all(*k);
    for (int l = 0; l < width; l += n) L::store(d + l, f(L::load(a + l), L::load(b + l), z));
  }
  static void logarithm(double* d, const double* a) {
    for (int l = 0; l < width; ++l) d[l] = std::log(a[l]);
  }
  static void power(double* d, const double* a, const double* b) {
    for (int l = 0; l < width; ++l) d[l] = std::pow(a[l], b[l]);
  }

  static void load1(const Instruction& i, const TapeTile& tile) {
    const double* const* rows = tile.inputs + i.array * Tape::kMaxWidth;
    for (int l = 0; l < width; ++l) tile.slots[i.d * width + l] = rows[l][i.k];
  }
  static void store1(const Instruction& i, const TapeTile& tile) {
    double* const* rows = tile.outputs + i.array * Tape::kMaxWidth;
    for (int l = 0; l < width; ++l) rows[l][i.k] = tile.slots[i.d * width + l];
  }
  /// Four neighbours of each lane's row into four slots: 4 x 4 blocks, turned.
  [[gnu::always_inline]] static inline void load4(const Instruction& i, const TapeTile& tile) {
    const double* const* rows = tile.inputs + i.array * Tape::kMaxWidth;
    double* d0 = tile.slots + i.d * width;
    double* d1 = tile.slots + i.a * width;
    double* d2 = tile.slots + i.b * width;
    double* d3 = tile.slots + i.c * width;
    if constexpr (width == 1) {
      const double* row = rows[0] + i.k;
      const double v0 = row[0], v1 = row[1], v2 = row[2], v3 = row[3];
      *d0 = v0, *d1 = v1, *d2 = v2, *d3 = v3;
    } else {
      for (int l = 0; l < width; l += 4) {
        Machine::turn4(rows[l] + i.k, rows[l + 1] + i.k, rows[l + 2] + i.k, rows[l + 3] + i.k,
                       d0 + l, d1 + l, d2 + l, d3 + l);
      }
    }
  }
  [[gnu::always_inline]] static inline void store4(const Instruction& i, const TapeTile& tile) {
    double* const* rows = tile.outputs + i.array * Tape::kMaxWidth;
    const double* s0 = tile.slots + i.d * width;
    const double* s1 = tile.slots + i.a * width;
    const double* s2 = tile.slots + i.b * width;
    const double* s3 = tile.slots + i.c * width;
    if constexpr (width == 1) {
      double* row = rows[0] + i.k;
      row[0] = *s0, row[1] = *s1, row[2] = *s2, row[3] = *s3;
    } else {
      for (int l = 0; l < width; l += 4) {
        Machine::turn4(s0 + l, s1 + l, s2 + l, s3 + l, rows[l] + i.k, rows[l + 1] + i.k,
                       rows[l + 2] + i.k, rows[l + 3] + i.k);
      }
    }
  }
};

/// All widths of a machine; `n`: lanes per vector.
template <class Machine, int n>
[[nodiscard]] constexpr TapeMachineCode machine_code() {
  return {&TapeKernel<Machine, 1, 1>::run, &TapeKernel<Machine, 4, n>::run,
          &TapeKernel<Machine, 8, n>::run, &TapeKernel<Machine, 16, n>::run};
}

}  // namespace stillzone::kinetics
