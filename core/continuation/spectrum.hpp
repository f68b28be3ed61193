#pragma once

#include <complex>
#include <optional>
#include <span>
#include <vector>

#include "core/dae/dae_system.hpp"

namespace stillzone::core {

/// How small disturbances of a steady state die out.
struct Spectrum {
  /// The eigenvalue with the largest real part [1/d]: minus the recovery rate of a stable state.
  std::complex<double> dominant;
  [[nodiscard]] bool stable() const { return dominant.real() < 0.0; }
};

/// Eigenvalues of the DAE's Jacobian with the algebraic unknowns eliminated,
///   A = J_dd - J_da J_aa^-1 J_ad   (d: differential, a: algebraic unknowns),
/// each unknown scaled by its size, by dense QR.
/// @return none beyond `most_unknowns` differential unknowns (dense work grows with the cube), for
///   a Jacobian that is not finite, or when QR does not converge
[[nodiscard]] std::optional<Spectrum> spectrum_at(DaeSystem& system, std::span<const double> y,
                                                  std::size_t most_unknowns);

/// Largest real part of the eigenvalues of a small dense matrix, row after row, n x n.
/// @return none when it is not finite or QR does not converge
[[nodiscard]] std::optional<double> spectral_abscissa(std::span<const double> matrix,
                                                      std::size_t n);

}  // namespace stillzone::core
