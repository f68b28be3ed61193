#pragma once

#include <array>
#include <cmath>
#include <complex>
#include <cstddef>

namespace stillzone::core {

/// A value and its derivatives with respect to N parameters, carried through every operation
/// (forward mode, exact). S is double or std::complex<double>: transforms are differentiated on
/// their complex contour with the same formulas.
template <class S, std::size_t N>
struct Dual {
  S value{};
  std::array<S, N> d{};

  Dual() = default;
  Dual(double constant) : value(constant) {}  // NOLINT(google-explicit-constructor): constants mix
  static Dual constant(S value) {
    Dual result;
    result.value = value;
    return result;
  }
  static Dual variable(S value, std::size_t number, S slope) {
    Dual result = constant(value);
    result.d[number] = slope;
    return result;
  }
  /// f(x) with f'(x) = slope.
  [[nodiscard]] Dual mapped(S f, S slope) const {
    Dual result = constant(f);
    for (std::size_t j = 0; j < N; ++j) result.d[j] = slope * d[j];
    return result;
  }
  friend Dual operator+(const Dual& a, const Dual& b) {
    Dual result = constant(a.value + b.value);
    for (std::size_t j = 0; j < N; ++j) result.d[j] = a.d[j] + b.d[j];
    return result;
  }
  friend Dual operator-(const Dual& a, const Dual& b) {
    Dual result = constant(a.value - b.value);
    for (std::size_t j = 0; j < N; ++j) result.d[j] = a.d[j] - b.d[j];
    return result;
  }
  friend Dual operator*(const Dual& a, const Dual& b) {
    Dual result = constant(a.value * b.value);
    for (std::size_t j = 0; j < N; ++j) result.d[j] = a.d[j] * b.value + a.value * b.d[j];
    return result;
  }
  friend Dual operator/(const Dual& a, const Dual& b) {
    const S inverse = S(1.0) / b.value;  // one division: complex ones are dear
    const S quotient = a.value * inverse;
    Dual result = constant(quotient);
    for (std::size_t j = 0; j < N; ++j) result.d[j] = (a.d[j] - quotient * b.d[j]) * inverse;
    return result;
  }
  friend Dual operator-(const Dual& a) { return a.mapped(-a.value, S(-1.0)); }
};

template <class S, std::size_t N>
Dual<S, N> exp(const Dual<S, N>& x) {
  using std::exp;
  const S e = exp(x.value);
  return x.mapped(e, e);
}
template <class S, std::size_t N>
Dual<S, N> log(const Dual<S, N>& x) {
  using std::log;
  return x.mapped(log(x.value), S(1.0) / x.value);
}
template <class S, std::size_t N>
Dual<S, N> sqrt(const Dual<S, N>& x) {
  using std::sqrt;
  const S root = sqrt(x.value);
  return x.mapped(root, S(0.5) / root);
}
/// exp(x) - 1 without cancellation near 0.
template <std::size_t N>
Dual<double, N> expm1(const Dual<double, N>& x) {
  return x.mapped(std::expm1(x.value), std::exp(x.value));
}

/// A real dual number on the complex plane.
template <std::size_t N>
Dual<std::complex<double>, N> to_complex(const Dual<double, N>& x) {
  Dual<std::complex<double>, N> result;
  result.value = x.value;
  for (std::size_t j = 0; j < N; ++j) result.d[j] = x.d[j];
  return result;
}
template <std::size_t N>
Dual<double, N> real_part(const Dual<std::complex<double>, N>& x) {
  Dual<double, N> result(x.value.real());
  for (std::size_t j = 0; j < N; ++j) result.d[j] = x.d[j].real();
  return result;
}

}  // namespace stillzone::core
