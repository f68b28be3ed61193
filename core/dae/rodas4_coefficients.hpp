#pragma once

#include <array>
#include <cstddef>

/// RODAS4, a stiffly accurate Rosenbrock method of order 4(3) with 6 stages, L-stable, for stiff
/// systems and index-1 DAEs, in the transformed form that needs no product with the Jacobian:
///   (M / (h gamma) - J) u_i = f(y0 + sum_{j<i} a_ij u_j) + M sum_{j<i} (c_ij / h) u_j
///   y1 = y0 + sum_{j<=5} a_6j u_j + u_6,  error estimate = u_6
///   y(t0 + s h) = (1-s) y0 + s (y1 + (1-s) (d_2 + s d_3)),  d_k = sum_j d_kj u_j
/// Source: Hairer and Wanner, Solving Ordinary Differential Equations II, 2nd ed. (1996), Section
/// IV.7 and VI.4 (method RODAS); verified in rodas4_coefficients_test by the order conditions.
namespace stillzone::core::rodas4 {

inline constexpr int kStages = 6;
inline constexpr double kGamma = 0.25;

using Lower = std::array<std::array<double, kStages>, kStages>;
using Weights = std::array<double, kStages>;

inline constexpr Lower kA = {{
    {},
    {1.544},
    {0.9466785280815826, 0.2557011698983284},
    {3.314825187068521, 2.896124015972201, 0.9986419139977817},
    {1.221224509226641, 6.019134481288629, 12.53708332932087, -0.6878860361058950},
    {1.221224509226641, 6.019134481288629, 12.53708332932087, -0.6878860361058950, 1.0},
}};

inline constexpr Lower kC = {{
    {},
    {-5.6688},
    {-2.430093356833875, -0.2063599157091915},
    {-0.1073529058151375, -9.594562251023355, -20.47028614809616},
    {7.496443313967647, -10.24680431464352, -33.99990352819905, 11.70890893206160},
    {8.083246795921522, -7.981132988064893, -31.52159432874371, 16.31930543123136,
     -6.058818238834054},
}};

/// y1 = y0 + sum m_j u_j.
inline constexpr Weights kM = {
    1.221224509226641, 6.019134481288629, 12.53708332932087, -0.6878860361058950, 1.0, 1.0};

inline constexpr Weights kD2 = {10.12623508344586,  -7.487995877610167, -34.80091861555747,
                                -7.992771707568823, 1.025137723295662,  0.0};
inline constexpr Weights kD3 = {-0.6762803392801253, 6.087714651680015,  16.43084320892478,
                                24.76722511418386,   -6.594389125716872, 0.0};

/// For a quadrature q' = g(y) in the same formula, v_i = h gamma (g_i + G u_i) + gamma sum c_ij v_j
/// with G = dg/dy at y0, a sum over weights m_i v_i is  h sum_i w_i (g_i + G u_i)  with
///   w = gamma (I - gamma C)^-T m.
[[nodiscard]] constexpr Weights quadrature_weights(const Weights& m) {
  Weights w{};
  for (int i = kStages - 1; i >= 0; --i) {
    double sum = m[static_cast<std::size_t>(i)];
    for (int k = i + 1; k < kStages; ++k) {
      sum += kC[static_cast<std::size_t>(k)][static_cast<std::size_t>(i)] *
             w[static_cast<std::size_t>(k)];
    }
    w[static_cast<std::size_t>(i)] = kGamma * sum;
  }
  return w;
}

}  // namespace stillzone::core::rodas4
