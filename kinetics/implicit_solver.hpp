#pragma once

#include <functional>
#include <span>
#include <vector>

#include "core/result.hpp"
#include "kinetics/kinetic_model.hpp"

namespace stillzone::kinetics {

/// Residuals (n) and their derivatives (n x n, row after row) at trial values (n).
using ImplicitFunction = std::function<void(std::span<const double> at, std::span<double> residual,
                                            std::span<double> derivative)>;

/// Finds a zone's implicit unknowns, each inside its [low, high], to the last digits.
///
/// One unknown: Newton steps kept inside a bracket of a change of sign, bisection where a step
/// would leave it or shrinks it too slowly. Several: Newton steps cut at the bounds and shortened
/// until the residuals, each scaled by its own row of derivatives, fall.
/// @param values in: where to start (the implicit's own start when outside its range); out: the
/// root
/// @return failure names the implicit unknown, its range and what was found there
[[nodiscard]] core::Result<core::Done> solve_implicit_equations(
    const std::vector<Implicit>& implicits, std::span<double> values,
    const ImplicitFunction& evaluate);

}  // namespace stillzone::kinetics
