#pragma once

#include <span>

#include "core/dae/dae_system.hpp"

namespace stillzone::core {

/// A DAE whose rates depend on one parameter: f(y, p).
class ParametricSystem {
 public:
  ParametricSystem() = default;
  virtual ~ParametricSystem() = default;
  ParametricSystem(const ParametricSystem&) = delete;
  ParametricSystem& operator=(const ParametricSystem&) = delete;

  /// The system at the parameter set last.
  [[nodiscard]] virtual DaeSystem& system() = 0;
  virtual void set_parameter(double p) = 0;
  /// df/dp at y and the parameter set last, size n_unknowns; every entry is written. Exact.
  virtual void parameter_derivative(std::span<const double> y, std::span<double> df) = 0;
};

}  // namespace stillzone::core
