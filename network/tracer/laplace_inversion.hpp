#pragma once

#include <cmath>
#include <complex>
#include <cstddef>

#include "core/dual_number.hpp"

namespace stillzone::network {

/// f(t) for t > 0 from its Laplace transform, with parameter derivatives: the midpoint rule on the
/// modified Talbot contour z = (N/t)(-0.6122 + 0.5017 phi cot(0.6407 phi) + 0.2645 i phi), whose
/// error falls as 3.89^-N.
/// Right for transforms whose singularities lie on the negative real axis. Source: Trefethen,
/// Weideman and Schmelzer (2006), Talbot quadratures and rational approximations, BIT 46:653.
/// @param transform complex dual s -> complex dual F(s)
template <std::size_t N, class Transform>
core::Dual<double, N> invert_laplace(const Transform& transform, double t) {
  using Complex = std::complex<double>;
  constexpr double kNodes = 56;  // even: nodes in conjugate pairs, one of each is evaluated
  core::Dual<double, N> sum;
  for (int k = 0; 2 * k < static_cast<int>(kNodes); ++k) {
    const double phi = (2.0 * k + 1.0) * M_PI / kNodes;
    const double tangent = std::tan(0.6407 * phi);
    const double sine = std::sin(0.6407 * phi);
    const Complex z = kNodes * Complex(-0.6122 + 0.5017 * phi / tangent, 0.2645 * phi);
    const Complex slope =
        kNodes * Complex(0.5017 / tangent - 0.5017 * 0.6407 * phi / (sine * sine), 0.2645);
    // 1/(2 pi i) * integral e^{zt} F dz; the pair of conjugate nodes gives twice the real part.
    const Complex weight = std::exp(z) * slope / Complex(0.0, 1.0) * (2.0 / kNodes) / t;
    const auto image = transform(core::Dual<Complex, N>::constant(z / t));
    sum = sum + core::real_part(core::Dual<Complex, N>::constant(weight) * image);
  }
  return sum;
}

}  // namespace stillzone::network
