#pragma once

#include <optional>
#include <span>

#include "core/dae/dae_system.hpp"

namespace stillzone::core {

/// Calls of the model by the solvers. Built without NDEBUG, the output is filled with a marked NaN
/// first; an entry the model leaves out is named in a ProgramDefect.
void evaluate_rates(DaeSystem& system, std::span<const double> y, std::span<double> f);
void evaluate_jacobian(DaeSystem& system, std::span<const double> y, std::span<double> values);
void evaluate_quadratures(DaeSystem& system, std::span<const double> y, std::span<double> g);

[[nodiscard]] bool all_finite(std::span<const double> values);
[[nodiscard]] std::optional<std::size_t> first_not_finite(std::span<const double> values);

/// A Failure that names unknown i of the system.
[[nodiscard]] Failure failure_at(const DaeSystem& system, std::size_t i, double t,
                                 std::string reason, std::string try_this);

}  // namespace stillzone::core
