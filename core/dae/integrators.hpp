#pragma once

#include <memory>

#include "core/dae/integrator.hpp"

/// The two methods behind make_integrator.
namespace stillzone::core {

/// What a user can try when an integration fails.
inline constexpr const char* kIntegrationAdvice =
    "Look at the feed, flows and constants that act there just before this time, or try another "
    "relative tolerance.";

[[nodiscard]] std::unique_ptr<Integrator> make_one_step_integrator(
    DaeSystem& system, LinearSolver& solver, const IntegratorOptions& options);
[[nodiscard]] std::unique_ptr<Integrator> make_multistep_integrator(
    DaeSystem& system, LinearSolver& solver, const IntegratorOptions& options);

/// A first step from the rates alone [d]: a hundredth of the time in which the fastest changing
/// mean would double. Source: Hairer, Norsett and Wanner, Solving ODEs I, Section II.4 (its first
/// guess). @return > 0, at most `most`.
[[nodiscard]] double first_step_guess(std::span<const double> y, std::span<const double> rates,
                                      std::span<const double> mass, std::span<const double> floors,
                                      double most);

}  // namespace stillzone::core
