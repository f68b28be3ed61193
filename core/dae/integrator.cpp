#include "core/dae/integrator.hpp"

#include <algorithm>
#include <cmath>
#include <string>
#include <utility>

#include "core/dae/integrators.hpp"
#include "core/require.hpp"

namespace stillzone::core {
namespace {

/// Counting more switches than this changes no choice.
constexpr long kEnoughSwitches = 1000;

struct Choice {
  IntegratorKind kind = IntegratorKind::multistep;
  std::string reason;
};

long count_switches(const DaeSystem& system, double from, double until) {
  long n = 0;
  double t = from;
  while (n < kEnoughSwitches) {
    const auto next = system.next_switch(t);
    if (!next || *next >= until) break;
    t = *next;
    ++n;
  }
  return n;
}

/// A multistep method starts anew at each switch with order 1 and short steps: measured 12 to 35
/// steps per switch against 3 to 5 of the one-step method. Between switches its steps are cheaper
/// (one solve, few factorisations, against six solves and a factorisation each), and its order up
/// to 5 pays at tight tolerances.
Choice choose(const DaeSystem& system, const IntegratorOptions& options,
              const IntegrationRequest& request) {
  const double span = request.until - request.from;
  const long n = count_switches(system, request.from, request.until);
  const double per_day = span > 0.0 ? static_cast<double>(n) / span : 0.0;
  const std::string found =
      fmt::format("{}{} switches in {:g} d at relative tolerance {:g}",
                  n >= kEnoughSwitches ? "at least " : "", n, span, options.relative_tolerance);
  if (per_day >= 0.1 && options.relative_tolerance >= 1e-10) {
    return {IntegratorKind::one_step,
            found +
                ": after each switch a one-step method needs 3 to 5 steps, a multistep method "
                "12 to 35"};
  }
  if (options.relative_tolerance >= 1e-4 && system.n_unknowns() <= 200) {
    return {IntegratorKind::one_step,
            found + fmt::format(", {} unknowns: at a loose tolerance on a small system the longer "
                                "steps of a one-step method are as cheap",
                                system.n_unknowns())};
  }
  return {IntegratorKind::multistep,
          found + ": long smooth stretches, on which a multistep method's steps are cheaper"};
}

/// Chooses at the first request and stays with the choice.
class AutomaticIntegrator final : public Integrator {
 public:
  AutomaticIntegrator(DaeSystem& system, LinearSolver& solver, const IntegratorOptions& options)
      : system_(system), solver_(solver), options_(options) {
    counts_.linear_solver = solver.name();
  }

  Result<Done> integrate(const IntegrationRequest& request, std::span<double> y,
                         std::span<double> q) override {
    if (!chosen_) {
      Choice choice = choose(system_, options_, request);
      reason_ = std::move(choice.reason);
      chosen_ = make_integrator(choice.kind, system_, solver_, options_);
    }
    auto done = chosen_->integrate(request, y, q);
    counts_ = chosen_->counts();
    counts_.reason = reason_;
    return done;
  }
  const IntegratorCounts& counts() const override { return counts_; }

 private:
  DaeSystem& system_;
  LinearSolver& solver_;
  IntegratorOptions options_;
  std::unique_ptr<Integrator> chosen_;
  std::string reason_;
  IntegratorCounts counts_;
};

}  // namespace

double first_step_guess(std::span<const double> y, std::span<const double> rates,
                        std::span<const double> mass, std::span<const double> floors, double most) {
  double size = 0.0;
  double rate = 0.0;
  for (std::size_t i = 0; i < y.size(); ++i) {
    const double scale = std::abs(y[i]) + floors[i];
    const double relative_size = y[i] / scale;
    const double relative_rate = mass[i] * rates[i] / scale;
    size += relative_size * relative_size;
    rate += relative_rate * relative_rate;
  }
  if (!(rate > 0.0)) return most;
  return std::min(most, 0.01 * std::max(1e-2, std::sqrt(size)) / std::sqrt(rate));
}

std::unique_ptr<Integrator> make_integrator(IntegratorKind kind, DaeSystem& system,
                                            LinearSolver& solver,
                                            const IntegratorOptions& options) {
  SZ_REQUIRE(options.relative_tolerance >= 1e-12 && options.relative_tolerance <= 1e-2,
             "relative tolerance {}", options.relative_tolerance);
  switch (kind) {
    case IntegratorKind::one_step:
      return make_one_step_integrator(system, solver, options);
    case IntegratorKind::multistep:
      return make_multistep_integrator(system, solver, options);
    case IntegratorKind::automatic:
      break;
  }
  return std::make_unique<AutomaticIntegrator>(system, solver, options);
}

}  // namespace stillzone::core
