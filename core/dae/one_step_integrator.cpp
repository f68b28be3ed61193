#include <algorithm>
#include <cmath>
#include <limits>
#include <string>
#include <vector>

#include "core/dae/evaluation.hpp"
#include "core/dae/integrators.hpp"
#include "core/dae/rosenbrock_step.hpp"
#include "core/dae/segment.hpp"
#include "core/dae/step_controller.hpp"
#include "core/require.hpp"

namespace stillzone::core {
namespace {

class OneStepIntegrator final : public Integrator {
 public:
  OneStepIntegrator(DaeSystem& system, LinearSolver& solver, const IntegratorOptions& options)
      : system_(system),
        solver_(solver),
        options_(options),
        step_(system, solver, options.relative_tolerance),
        n_(system.n_unknowns()),
        dense_y_(n_),
        dense_q_(system.n_quadratures()),
        q_start_(system.n_quadratures()) {
    counts_.method = "one-step (RODAS4)";
    counts_.reason = "asked for";
    counts_.linear_solver = solver.name();
    has_algebraic_ = std::ranges::find(system.differential(), 0) != system.differential().end();
  }

  Result<Done> integrate(const IntegrationRequest& request, std::span<double> y,
                         std::span<double> q) override;
  const IntegratorCounts& counts() const override { return counts_; }

 private:
  Result<Done> enter(double t, std::span<double> y);
  Result<Done> run_segment(const IntegrationRequest& request, RecordTimes& records, double end,
                           std::span<double> y, std::span<double> q);
  Result<Done> accepted_step(double end, double& h, double& next);
  void record_within(RecordTimes& records, double start, double h);
  double first_step(std::span<const double> y, double span) const;
  void update_counts();
  Failure failure(RosenbrockStep::Outcome outcome, double h, double error) const;

  DaeSystem& system_;
  LinearSolver& solver_;
  IntegratorOptions options_;
  RosenbrockStep step_;
  StepController controller_;
  LearntSteps learnt_;
  IntegratorCounts counts_;
  std::size_t n_;
  std::vector<double> dense_y_, dense_q_, q_start_;
  bool has_algebraic_ = false;
  double t_ = 0.0;
  std::size_t solves_before_ = 0;
  std::size_t factorisations_before_ = 0;
};

Result<Done> OneStepIntegrator::integrate(const IntegrationRequest& request, std::span<double> y,
                                          std::span<double> q) {
  SZ_REQUIRE(y.size() == n_ && q.size() == system_.n_quadratures(), "y {} of {}, q {} of {}",
             y.size(), n_, q.size(), system_.n_quadratures());
  SZ_REQUIRE(request.until >= request.from, "from {} until {}", request.from, request.until);
  solves_before_ = solver_.n_solves;
  factorisations_before_ = solver_.n_factorisations;
  RecordTimes records(request);
  t_ = request.from;
  if (auto entered = enter(t_, y); !entered) return entered;
  while (records.due(t_)) records.record(y, q);
  while (t_ < request.until) {
    const double end = std::min(system_.next_switch(t_).value_or(request.until), request.until);
    auto done = run_segment(request, records, end, y, q);
    update_counts();
    if (!done) return done;
    if (t_ < request.until) {
      ++counts_.switches;
      if (auto entered = enter(t_, y); !entered) return entered;
    }
  }
  return Done{};
}

Result<Done> OneStepIntegrator::enter(double t, std::span<double> y) {
  system_.enter(t);
  controller_.restart();
  if (!has_algebraic_) return Done{};
  return system_.make_consistent(y);
}

double OneStepIntegrator::first_step(std::span<const double> y, double span) const {
  const double learnt = learnt_.of(system_.interval_kind());
  if (learnt > 0.0) return learnt;
  if (options_.first_step > 0.0) return options_.first_step;
  return first_step_guess(y, step_.rates(), step_.mass(), system_.floors(), span);
}

Result<Done> OneStepIntegrator::run_segment(const IntegrationRequest& request, RecordTimes& records,
                                            double end, std::span<double> y, std::span<double> q) {
  double next = 0.0;
  bool first = true;
  while (t_ < end) {
    const auto outcome = step_.begin(y);
    if (outcome != RosenbrockStep::Outcome::done) return failure(outcome, next, 0.0);
    if (first) next = first_step(y, end - t_);
    double h = next;
    if (auto done = accepted_step(end, h, next); !done) return done;
    if (first) learnt_.learn(system_.interval_kind(), next);
    first = false;
    const double start = t_;
    t_ = h >= end - t_ ? end : t_ + h;
    const bool dense = records.due(t_) && records.time() < t_;
    if (dense) std::ranges::copy(q, q_start_.begin());
    step_.advance_quadratures(q);
    if (dense) record_within(records, start, h);
    std::ranges::copy(step_.state(), y.begin());
    while (records.due(t_)) records.record(y, q);
    if (request.progress) request.progress(t_);
  }
  return Done{};
}

/// Tries steps from the state begun until one is accepted; h: the step to try in, the step taken
/// out; next: the step to try after it.
Result<Done> OneStepIntegrator::accepted_step(double end, double& h, double& next) {
  const double left = end - t_;
  const double least = 16.0 * std::numeric_limits<double>::epsilon() * std::max(std::abs(t_), 1e-8);
  if (options_.longest_step > 0.0) h = std::min(h, options_.longest_step);
  while (true) {
    if (h >= left * (1.0 - 1e-9)) {
      h = left;
    } else if (2.0 * h > left) {
      h = 0.5 * left;  // two even steps instead of a long and a stub
    }
    if (counts_.steps + counts_.rejected_steps >= options_.most_steps) {
      return failure_at(system_, n_, t_,
                        fmt::format("more than {} steps are needed", options_.most_steps),
                        kIntegrationAdvice);
    }
    const auto outcome = step_.attempt(h);
    if (outcome == RosenbrockStep::Outcome::done && step_.error() <= 1.0) {
      ++counts_.steps;
      next = controller_.after_accepted(h, step_.error());
      return Done{};
    }
    ++counts_.rejected_steps;
    const bool valid = outcome == RosenbrockStep::Outcome::done;
    const double smaller =
        valid ? controller_.after_rejected(h, step_.error()) : controller_.after_invalid(h);
    if (smaller < least && smaller < left) return failure(outcome, h, step_.error());
    h = smaller;
  }
}

void OneStepIntegrator::record_within(RecordTimes& records, double start, double h) {
  while (records.due(t_) && records.time() < t_) {
    const double s = std::clamp((records.time() - start) / h, 0.0, 1.0);
    step_.dense_state(s, dense_y_);
    step_.dense_quadratures(s, q_start_, dense_q_);
    records.record(dense_y_, dense_q_);
  }
}

void OneStepIntegrator::update_counts() {
  counts_.rate_calls = step_.rate_calls;
  counts_.jacobian_calls = step_.jacobian_calls;
  counts_.solves += static_cast<long>(solver_.n_solves - solves_before_);
  counts_.factorisations += static_cast<long>(solver_.n_factorisations - factorisations_before_);
  solves_before_ = solver_.n_solves;
  factorisations_before_ = solver_.n_factorisations;
}

Failure OneStepIntegrator::failure(RosenbrockStep::Outcome outcome, double h, double error) const {
  std::string reason;
  std::size_t at = step_.culprit();
  switch (outcome) {
    case RosenbrockStep::Outcome::not_finite:
      reason = h > 0.0 ? fmt::format("the rates are not finite, down to a step of {:.3g} d", h)
                       : "the rates are not finite";
      break;
    case RosenbrockStep::Outcome::singular:
      reason = fmt::format("the matrix of the step is singular, down to a step of {:.3g} d", h);
      break;
    case RosenbrockStep::Outcome::done:
      at = step_.worst_unknown();
      reason = fmt::format("a step of {:.3g} d still misses the tolerance {:g}, {:.3g} times", h,
                           options_.relative_tolerance, error);
      break;
  }
  Failure result = failure_at(system_, at, t_, std::move(reason), kIntegrationAdvice);
  result.got_done = fmt::format("{} steps were done.", counts_.steps);
  return result;
}

}  // namespace

std::unique_ptr<Integrator> make_one_step_integrator(DaeSystem& system, LinearSolver& solver,
                                                     const IntegratorOptions& options) {
  return std::make_unique<OneStepIntegrator>(system, solver, options);
}

}  // namespace stillzone::core
