#pragma once

#include <cstdint>

/// Arithmetic on a few lanes at once, as the compilers' vector types give it. Nothing here may call
/// an inline function of a library: files that include this are compiled for different processors,
/// and the linker would keep one copy of such a function for all of them.
namespace stillzone::kinetics {

// One by one: g++ 12 drops a vector size that depends on a template parameter.
template <int n>
struct LaneTypes;
template <>
struct LaneTypes<1> {
  using Real = double;
  using Bits = std::int64_t;
};
template <>
struct LaneTypes<2> {
  using Real = double __attribute__((vector_size(16)));
  using Bits = std::int64_t __attribute__((vector_size(16)));
};
template <>
struct LaneTypes<4> {
  using Real = double __attribute__((vector_size(32)));
  using Bits = std::int64_t __attribute__((vector_size(32)));
};

/// @tparam Machine a tag that keeps the machines' instantiations apart; Machine::kFused tells
///   whether multiply-add is one instruction
template <class Machine, int n>
struct Lanes {
  using Real = typename LaneTypes<n>::Real;
  using Bits = typename LaneTypes<n>::Bits;

  [[gnu::always_inline]] static inline Real load(const double* from) {
    Real value;
    __builtin_memcpy(&value, from, sizeof value);
    return value;
  }
  [[gnu::always_inline]] static inline void store(double* to, Real value) {
    __builtin_memcpy(to, &value, sizeof value);
  }
  [[gnu::always_inline]] static inline Real all(double value) {
    if constexpr (n == 1) {
      return value;
    } else {
      Real lanes = {};
      for (int i = 0; i < n; ++i) lanes[i] = value;
      return lanes;
    }
  }
  /// f on each lane.
  template <class F>
  [[gnu::always_inline]] static inline Real each(Real a, Real b, F f) {
    if constexpr (n == 1) {
      return f(a, b);
    } else {
      Real result = {};
      for (int i = 0; i < n; ++i) result[i] = f(a[i], b[i]);
      return result;
    }
  }
  /// a b + c, rounded once where the machine can.
  [[gnu::always_inline]] static inline Real multiply_add(Real a, Real b, Real c) {
    if constexpr (!Machine::kFused) {
      return a * b + c;
    } else if constexpr (n == 1) {
      return __builtin_fma(a, b, c);
    } else {
      return Machine::template fused<n>(a, b, c);
    }
  }
  [[gnu::always_inline]] static inline Real sqrt(Real a) {
    return each(a, a, [](double x, double) { return __builtin_sqrt(x); });
  }
  /// A NaN is passed on.
  [[gnu::always_inline]] static inline Real minimum(Real a, Real b) {
    return each(a, b, [](double p, double q) { return p < q || __builtin_isnan(p) ? p : q; });
  }
  [[gnu::always_inline]] static inline Real maximum(Real a, Real b) {
    return each(a, b, [](double p, double q) { return p > q || __builtin_isnan(p) ? p : q; });
  }
  [[gnu::always_inline]] static inline Real step(Real a) {
    return each(a, a, [](double p, double) { return p < 0.0 ? 0.0 : 1.0; });
  }
  [[gnu::always_inline]] static inline Bits bits_of(Real a) {
    Bits bits;
    __builtin_memcpy(&bits, &a, sizeof bits);
    return bits;
  }
  [[gnu::always_inline]] static inline Real real_of(Bits a) {
    Real value;
    __builtin_memcpy(&value, &a, sizeof value);
    return value;
  }

  /// exp to about 1 ulp, subnormal results, overflow and NaN included.
  ///   x = n log 2 + r, |r| <= log(2)/2; exp(x) = 2^n exp(r), exp(r) by its Taylor series to r^13
  ///   (truncation 4e-18 relative)
  [[gnu::always_inline]] static inline Real exp(Real x) {
    constexpr double kRounder = 0x1.8p52;  // adding it rounds to an integer in the low bits
    const Real low = all(-746.0);
    const Real high = all(710.0);
    x = x < low ? low : x;
    x = x > high ? high : x;
    const Real whole = multiply_add(x, all(0x1.71547652b82fep0), all(kRounder)) - all(kRounder);
    // log 2 in two parts; the first has 32 bits, so that whole * first is exact.
    Real r = multiply_add(whole, all(-0x1.62e42feep-1), x);
    r = multiply_add(whole, all(-0x1.a39ef35793c76p-33), r);
    Real series = all(1.0 / 6227020800.0);
    series = multiply_add(series, r, all(1.0 / 479001600.0));
    series = multiply_add(series, r, all(1.0 / 39916800.0));
    series = multiply_add(series, r, all(1.0 / 3628800.0));
    series = multiply_add(series, r, all(1.0 / 362880.0));
    series = multiply_add(series, r, all(1.0 / 40320.0));
    series = multiply_add(series, r, all(1.0 / 5040.0));
    series = multiply_add(series, r, all(1.0 / 720.0));
    series = multiply_add(series, r, all(1.0 / 120.0));
    series = multiply_add(series, r, all(1.0 / 24.0));
    series = multiply_add(series, r, all(1.0 / 6.0));
    series = multiply_add(series, r, all(0.5));
    series = multiply_add(series * r, r, r) + all(1.0);
    // 2^n in two factors, each a normal number.
    const Real half = multiply_add(whole, all(0.5), all(kRounder)) - all(kRounder);
    return series * power_of_two(half) * power_of_two(whole - half);
  }

 private:
  [[gnu::always_inline]] static inline Real power_of_two(Real integer) {
    return real_of((bits_of(integer + all(0x1.8p52)) + 1023) << 52);
  }
};

}  // namespace stillzone::kinetics
