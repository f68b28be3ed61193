#pragma once

#include <functional>
#include <memory>
#include <span>
#include <string>

#include "core/dae/dae_system.hpp"
#include "core/dae/linear_solver.hpp"
#include "core/result.hpp"

namespace stillzone::core {

enum class IntegratorKind {
  automatic,  ///< chosen by switches per time and tolerance; the choice stands in the counts
  multistep,  ///< SUNDIALS IDA(S): variable-order BDF, restarted at switches
  one_step,   ///< RODAS4 (Hairer and Wanner, Solving ODEs II): linearly implicit, order 4(3)
};

struct IntegratorOptions {
  double relative_tolerance = 1e-6;  ///< 1e-12 .. 1e-2
  double first_step = 0.0;           ///< [d] 0: found from the rates
  double longest_step = 0.0;         ///< [d] 0: no limit
  long most_steps = 5'000'000;       ///< over the whole integration
};

/// What a run did, for the summary.
struct IntegratorCounts {
  std::string method;  ///< "multistep (IDAS)", "one-step (RODAS4)"
  std::string reason;  ///< why this method was taken
  std::string linear_solver;
  long steps = 0;
  long rejected_steps = 0;
  long rate_calls = 0;
  long jacobian_calls = 0;
  long factorisations = 0;
  long solves = 0;
  long switches = 0;
};

struct IntegrationRequest {
  double from = 0.0;   ///< [d]
  double until = 0.0;  ///< [d] >= from
  /// Rising times within [from, until] at which `record` is called (dense output between steps; at
  /// a switch time the state is continuous, so one call is enough).
  std::span<const double> record_at{};
  std::function<void(double t, std::span<const double> y, std::span<const double> q)> record{};
  /// Called after each accepted step with the time reached; may be empty.
  std::function<void(double t)> progress{};
};

class Integrator {
 public:
  Integrator() = default;
  virtual ~Integrator() = default;
  Integrator(const Integrator&) = delete;
  Integrator& operator=(const Integrator&) = delete;

  /// Integrates y and q in place from request.from to request.until. y must be consistent at
  /// entry (DaeSystem::make_consistent). Stops exactly at each switch.
  /// Failure (exit 3) names the unknown with the largest error, the time, and what to try.
  [[nodiscard]] virtual Result<Done> integrate(const IntegrationRequest& request,
                                               std::span<double> y, std::span<double> q) = 0;
  [[nodiscard]] virtual const IntegratorCounts& counts() const = 0;
};

/// The system and the solver must outlive the integrator.
[[nodiscard]] std::unique_ptr<Integrator> make_integrator(IntegratorKind kind, DaeSystem& system,
                                                          LinearSolver& solver,
                                                          const IntegratorOptions& options);

}  // namespace stillzone::core
