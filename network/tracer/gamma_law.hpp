#pragma once

#include <array>
#include <cstddef>

#include "core/dual_number.hpp"

namespace stillzone::network {

/// Regularised lower incomplete gamma function P(a, x) with both derivatives.
struct GammaValue {
  double value = 0.0;
  double by_shape = 0.0;  ///< dP/da
  double by_x = 0.0;      ///< dP/dx = x^(a-1) e^-x / Gamma(a)
};
/// @param shape a > 0; @param x >= 0. Value by Boost.Math; dP/da term by term from the series
/// P = sum of x^(a+k) e^-x / Gamma(a+k+1) (DLMF 8.7.1).
[[nodiscard]] GammaValue gamma_law(double shape, double x);

/// x^(a-1) e^-x / Gamma(a) with both derivatives.
[[nodiscard]] GammaValue gamma_law_density(double shape, double x);

template <std::size_t N>
core::Dual<double, N> combine(const GammaValue& value, const core::Dual<double, N>& shape,
                              const core::Dual<double, N>& x) {
  core::Dual<double, N> result(value.value);
  for (std::size_t j = 0; j < N; ++j) {
    result.d[j] = value.by_shape * shape.d[j] + value.by_x * x.d[j];
  }
  return result;
}
template <std::size_t N>
core::Dual<double, N> gamma_cumulative(const core::Dual<double, N>& shape,
                                       const core::Dual<double, N>& x) {
  return combine(gamma_law(shape.value, x.value), shape, x);
}
template <std::size_t N>
core::Dual<double, N> gamma_density(const core::Dual<double, N>& shape,
                                    const core::Dual<double, N>& x) {
  return combine(gamma_law_density(shape.value, x.value), shape, x);
}

}  // namespace stillzone::network
