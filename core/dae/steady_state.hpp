#pragma once

#include <functional>
#include <span>
#include <string>

#include "core/dae/dae_system.hpp"
#include "core/dae/linear_solver.hpp"
#include "core/result.hpp"

namespace stillzone::core {

struct SteadyOptions {
  /// Newton is finished when the largest relative step |dy_i| / max(|y_i|, floor_i) is below this.
  double relative_step = 1e-11;
  /// [d] Time integration from the start leads into the basin; given up after this long.
  double longest_time = 1e5;
  std::function<void(double t)> progress{};
};

struct SteadyReport {
  std::string how;  ///< "settled after 212 d of loose integration, then 4 Newton steps: ..."
  double settled_time_d = 0;  ///< [d] model time integrated before Newton took over
  int newton_steps = 0;
  double last_relative_step = 0;
  double residual = 0;  ///< largest |f_i| / max(|y_i|, floor_i) [1/d]
  long steps = 0;       ///< steps of the loose integration
  long rate_calls = 0;
  long jacobian_calls = 0;
  long factorisations = 0;
};

/// The steady state that time integration from y settles to: error-controlled one-step integration
/// (L-stable, loose tolerance, steps growing as rates die out) into the basin, then Newton with the
/// exact Jacobian. When Newton leaves the basin (a relative change that is not small, or a negative
/// concentration, or a state that repels the path so far) the integration goes on from where it
/// was. y in and out; the system's present interval (DaeSystem::enter) is kept.
[[nodiscard]] Result<SteadyReport> find_steady_state(DaeSystem& system, LinearSolver& solver,
                                                     const SteadyOptions& options,
                                                     std::span<double> y);

}  // namespace stillzone::core
