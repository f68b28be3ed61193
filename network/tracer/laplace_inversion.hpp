#pragma once

#include <cmath>
#include <complex>
#include <cstddef>
#include <vector>

#include "core/dual_number.hpp"

namespace stillzone::network {

/// Nodes and weights of the midpoint rule on the modified Talbot contour
/// z = N (-0.6122 + 0.5017 phi cot(0.6407 phi) + 0.2645 i phi), for t = 1; one of each conjugate
/// pair, the weight counting for both. Source: Trefethen, Weideman and Schmelzer (2006), Talbot
/// quadratures and rational approximations, BIT 46:653; the error falls as 3.89^-N.
struct TalbotRule {
  std::vector<std::complex<double>> nodes;
  std::vector<std::complex<double>> weights;
  /// @param n_nodes even
  explicit TalbotRule(int n_nodes) {
    using Complex = std::complex<double>;
    for (int k = 0; 2 * k < n_nodes; ++k) {
      const double phi = (2.0 * k + 1.0) * M_PI / n_nodes;
      const double tangent = std::tan(0.6407 * phi);
      const double sine = std::sin(0.6407 * phi);
      const double n = n_nodes;
      const Complex z = n * Complex(-0.6122 + 0.5017 * phi / tangent, 0.2645 * phi);
      const Complex slope =
          n * Complex(0.5017 / tangent - 0.5017 * 0.6407 * phi / (sine * sine), 0.2645);
      // 1/(2 pi i) * integral e^{zt} F dz; the pair of conjugate nodes gives twice the real part.
      nodes.push_back(z);
      weights.push_back(std::exp(z) * slope / Complex(0.0, 1.0) * (2.0 / n));
    }
  }
};

/// f(t) for t > 0 from its Laplace transform, with parameter derivatives. Right for transforms
/// whose singularities lie on the negative real axis.
/// @param transform complex dual s -> complex dual F(s)
template <std::size_t N, class Transform>
core::Dual<double, N> invert_laplace(const TalbotRule& rule, const Transform& transform, double t) {
  using Complex = std::complex<double>;
  core::Dual<double, N> sum;
  for (std::size_t k = 0; k < rule.nodes.size(); ++k) {
    const auto image = transform(core::Dual<Complex, N>::constant(rule.nodes[k] / t));
    sum = sum + core::real_part(core::Dual<Complex, N>::constant(rule.weights[k] / t) * image);
  }
  return sum;
}

}  // namespace stillzone::network
