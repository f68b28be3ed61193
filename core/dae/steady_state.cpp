#include "core/dae/steady_state.hpp"

#include <algorithm>
#include <cmath>
#include <limits>
#include <string>
#include <utility>
#include <vector>

#include "core/dae/evaluation.hpp"
#include "core/dae/integrators.hpp"
#include "core/dae/rosenbrock_step.hpp"
#include "core/dae/step_controller.hpp"
#include "core/require.hpp"

namespace stillzone::core {
namespace {

/// Tolerance of the way into the basin: the state there need not be accurate, but must not leave
/// the path that accurate integration follows.
constexpr double kLooseTolerance = 1e-3;
/// Newton may start when, at the present rates, no unknown would change by more than this share of
/// itself in as much time again as has passed.
constexpr double kDiedOut = 0.1;
/// An unknown that has fallen to this share of its largest value so far is on its way out: its
/// changes count against this share, not against what is left.
constexpr double kFadedShare = 1e-2;
/// No step longer than this share of the time passed (or one day): long implicit steps damp
/// growth, and a population that slowly takes off must not be missed.
constexpr double kLongestShare = 0.5;
/// How far Newton may move an unknown in all, relative to the settled state.
constexpr double kFarthest = 0.5;
/// A first Newton step of less than this needs no check of its direction.
constexpr double kSmallMove = 1e-3;
constexpr int kMostNewtonSteps = 25;
constexpr long kMostSteps = 200'000;

constexpr const char* kTry =
    "Look at its history with a dynamic run; an operation that swings has a periodic state, not a "
    "steady one.";

class SteadySearch {
 public:
  SteadySearch(DaeSystem& system, LinearSolver& solver, const SteadyOptions& options,
               std::span<double> y)
      : system_(system),
        solver_(solver),
        options_(options),
        y_(y),
        floors_(system.floors()),
        n_(system.n_unknowns()),
        step_(system, solver, kLooseTolerance),
        peak_(n_),
        change_(n_),
        trial_(n_),
        move_(n_),
        rates_(n_),
        rounding_(n_),
        zeros_(n_),
        diagonal_(n_),
        jacobian_(static_cast<std::size_t>(system.pattern().n_entries())),
        factorisations_before_(solver.n_factorisations) {
    for (std::size_t i = 0; i < n_; ++i) peak_[i] = std::abs(y[i]);
  }

  Result<SteadyReport> run();

 private:
  Result<Done> advance();
  void accept(double h);
  [[nodiscard]] bool worth_newton() const;
  [[nodiscard]] bool newton();
  [[nodiscard]] bool follows_the_path(std::span<const double> move) const;
  [[nodiscard]] bool within_reach() const;
  [[nodiscard]] bool path_is_drawn_in();
  [[nodiscard]] bool residual_is_rounding();
  [[nodiscard]] double largest_relative(std::span<const double> x,
                                        std::span<const double> state) const;
  [[nodiscard]] double size(std::size_t i, std::span<const double> state) const {
    return std::max(std::abs(state[i]), floors_[i]);
  }
  [[nodiscard]] double faded_size(std::size_t i) const {
    return std::max(size(i, y_), kFadedShare * peak_[i]);
  }
  [[nodiscard]] SteadyReport report() const;
  [[nodiscard]] Failure unsettled() const;

  DaeSystem& system_;
  LinearSolver& solver_;
  const SteadyOptions& options_;
  std::span<double> y_;
  std::span<const double> floors_;
  std::size_t n_;
  RosenbrockStep step_;
  StepController controller_;
  std::vector<double> peak_;    // largest |y| so far
  std::vector<double> change_;  // mean rate of change over the last step [1/d]
  std::vector<double> trial_, move_, rates_, rounding_, zeros_, diagonal_, jacobian_;
  std::size_t factorisations_before_;
  double t_ = 0.0;
  double next_ = 0.0;
  double next_try_ = 0.0;
  long steps_ = 0;
  long rejected_ = 0;
  long newton_rate_calls_ = 0;
  long newton_jacobian_calls_ = 0;
  int newton_steps_ = 0;
  double last_relative_step_ = 0.0;
  double residual_ = 0.0;
  bool at_rounding_ = false;
  std::string newton_failure_;
};

Result<SteadyReport> SteadySearch::run() {
  if (const auto i = first_not_finite(y_)) {
    return failure_at(system_, *i, 0.0, "the start is not finite", "Check the start state.");
  }
  while (true) {
    const auto outcome = step_.begin(y_);
    if (outcome != RosenbrockStep::Outcome::done) {
      return failure_at(system_, step_.culprit(), t_, "the rates are not finite",
                        "Check the start state and the constants that act there.");
    }
    if (steps_ == 0) {
      next_ = first_step_guess(y_, step_.rates(), step_.mass(), floors_, options_.longest_time);
    } else if (worth_newton()) {
      if (newton()) return report();
      next_try_ = 1.3 * t_;
    }
    if (t_ >= options_.longest_time || steps_ + rejected_ > kMostSteps) return unsettled();
    if (auto advanced = advance(); !advanced) return advanced.failure();
    if (options_.progress) options_.progress(t_);
  }
}

/// One accepted step of the loose integration.
Result<Done> SteadySearch::advance() {
  const double longest =
      std::min(std::max(1.0, kLongestShare * t_), std::max(options_.longest_time - t_, 1e-6));
  double h = std::min(next_, longest);
  while (true) {
    const auto outcome = step_.attempt(h);
    const bool valid = outcome == RosenbrockStep::Outcome::done;
    if (valid && step_.error() <= 1.0) {
      next_ = controller_.after_accepted(h, step_.error());
      accept(h);
      return Done{};
    }
    ++rejected_;
    const double smaller =
        valid ? controller_.after_rejected(h, step_.error()) : controller_.after_invalid(h);
    if (smaller < 16.0 * std::numeric_limits<double>::epsilon() * std::max(t_, 1e-6)) {
      Failure failure = failure_at(
          system_, valid ? step_.worst_unknown() : step_.culprit(), t_,
          fmt::format("on the way to the steady state a step of {:.3g} d {}", h,
                      valid ? "still misses the loose tolerance"
                            : "still gives numbers that are not finite or a singular matrix"),
          "Check the start state and the constants that act there.");
      failure.got_done = fmt::format("{} steps were done.", steps_);
      return failure;
    }
    h = smaller;
  }
}

void SteadySearch::accept(double h) {
  const auto reached = step_.state();
  for (std::size_t i = 0; i < n_; ++i) {
    change_[i] = (reached[i] - y_[i]) / h;
    y_[i] = reached[i];
    peak_[i] = std::max(peak_[i], std::abs(reached[i]));
  }
  t_ += h;
  ++steps_;
}

bool SteadySearch::worth_newton() const {
  if (t_ < next_try_) return false;
  for (std::size_t i = 0; i < n_; ++i) {
    if (std::abs(change_[i]) * t_ > kDiedOut * faded_size(i)) return false;
  }
  return true;
}

/// Newton moves on along the path the integration is on: an unstable state nearby pulls Newton
/// against the flow.
bool SteadySearch::follows_the_path(std::span<const double> move) const {
  for (std::size_t i = 0; i < n_; ++i) {
    const bool matters = std::abs(move[i]) > kSmallMove * size(i, y_);
    if (matters && change_[i] * move[i] < 0.0) return false;
  }
  return true;
}

bool SteadySearch::within_reach() const {
  for (std::size_t i = 0; i < n_; ++i) {
    if (!(std::abs(trial_[i] - y_[i]) <= kFarthest * faded_size(i) * (1.0 + 1e-6))) return false;
  }
  return true;
}

double SteadySearch::largest_relative(std::span<const double> x,
                                      std::span<const double> state) const {
  double largest = 0.0;
  for (std::size_t i = 0; i < n_; ++i) {
    largest = std::max(largest, std::abs(x[i]) / size(i, state));
  }
  return largest;
}

/// |f_i| is within a few units of rounding of the terms it sums: sum_j |J_ij y_j| bounds their
/// size.
bool SteadySearch::residual_is_rounding() {
  const SparsePattern& pattern = system_.pattern();
  std::ranges::fill(rounding_, 0.0);
  for (std::size_t j = 0; j < n_; ++j) {
    for (auto k = pattern.start[j]; k < pattern.start[j + 1]; ++k) {
      const auto at = static_cast<std::size_t>(k);
      rounding_[static_cast<std::size_t>(pattern.row[at])] += std::abs(jacobian_[at] * trial_[j]);
    }
  }
  constexpr double kUnits = 256.0 * std::numeric_limits<double>::epsilon();
  for (std::size_t i = 0; i < n_; ++i) {
    if (std::abs(rates_[i]) > kUnits * (rounding_[i] + floors_[i])) return false;
  }
  return true;
}

/// Whether the way from the settled state to Newton's state dies out under M e' = J e. A path can
/// slow down beside an unstable state and leave it later; there, implicit Euler steps on e,
///   (M / tau - J) e_next = M e / tau,
/// multiply the unstable part by 1 / |1 - lambda tau| > 1 when 0 < lambda tau < 2, and each stable
/// part by less than 1. The taus (0.5 to 128 d) cover growth rates of 0.0035 to 3.6 1/d. A mode the
/// path does not touch (a group that is exactly absent) stays out, as in time integration.
bool SteadySearch::path_is_drawn_in() {
  constexpr int kRounds = 16;
  constexpr double kGrowth = 1.02;
  const auto mass = step_.mass();
  evaluate_jacobian(system_, trial_, jacobian_);
  ++newton_jacobian_calls_;
  for (double tau = 0.5; tau <= 128.0; tau *= 4.0) {
    for (std::size_t i = 0; i < n_; ++i) {
      diagonal_[i] = mass[i] / tau;
      move_[i] = mass[i] * (y_[i] - trial_[i]);
    }
    if (largest_relative(move_, trial_) < 1e-12) return true;  // started on it
    if (!solver_.factor(diagonal_, jacobian_)) return false;
    double growth = 0.0;
    for (int k = 0; k < kRounds; ++k) {
      const double before = largest_relative(move_, trial_);
      if (!(before > 0.0)) break;
      for (std::size_t i = 0; i < n_; ++i) move_[i] *= diagonal_[i] / before;
      solver_.solve(move_);
      for (std::size_t i = 0; i < n_; ++i) move_[i] *= mass[i];
      growth = largest_relative(move_, trial_);
    }
    if (!(growth < kGrowth)) return false;
  }
  return true;
}

/// Full Newton steps from the settled state; y_ is replaced on success only.
bool SteadySearch::newton() {
  std::ranges::copy(y_, trial_.begin());
  std::ranges::copy(step_.rates(), rates_.begin());
  std::ranges::copy(step_.jacobian(), jacobian_.begin());
  double before = std::numeric_limits<double>::infinity();
  newton_steps_ = 0;
  for (int k = 0; k < kMostNewtonSteps; ++k) {
    if (!solver_.factor(zeros_, jacobian_)) {
      const auto i = static_cast<std::size_t>(solver_.singular_column());
      newton_failure_ = fmt::format("The steady-state matrix is singular at {}, {}.",
                                    system_.unknown_place(i), system_.unknown_quantity(i));
      return false;
    }
    std::ranges::copy(rates_, move_.begin());
    solver_.solve(move_);
    if (!all_finite(move_)) return false;
    if (k == 0 && !follows_the_path(move_)) return false;
    for (std::size_t i = 0; i < n_; ++i) trial_[i] += move_[i];
    ++newton_steps_;
    if (!within_reach()) return false;
    last_relative_step_ = largest_relative(move_, trial_);
    evaluate_rates(system_, trial_, rates_);
    ++newton_rate_calls_;
    if (!all_finite(rates_)) return false;
    const bool stagnates = last_relative_step_ < 1e-6 && last_relative_step_ > 0.25 * before;
    at_rounding_ = stagnates && residual_is_rounding();
    if (last_relative_step_ <= options_.relative_step || at_rounding_) break;
    if (k > 3 && last_relative_step_ > 0.5 * before && !stagnates) return false;
    if (k + 1 == kMostNewtonSteps) return false;
    before = last_relative_step_;
    evaluate_jacobian(system_, trial_, jacobian_);
    ++newton_jacobian_calls_;
  }
  for (std::size_t i = 0; i < n_; ++i) {
    // a settled concentration (>= 0, up to the loose tolerance) stays one
    if (y_[i] > -kLooseTolerance * floors_[i] && trial_[i] < -1e-9 * floors_[i]) return false;
  }
  if (!path_is_drawn_in()) return false;
  std::ranges::copy(trial_, y_.begin());
  residual_ = largest_relative(rates_, y_);
  return true;
}

SteadyReport SteadySearch::report() const {
  SteadyReport result;
  result.settled_time_d = t_;
  result.newton_steps = newton_steps_;
  result.last_relative_step = last_relative_step_;
  result.residual = residual_;
  result.steps = steps_;
  result.rate_calls = step_.rate_calls + newton_rate_calls_;
  result.jacobian_calls = step_.jacobian_calls + newton_jacobian_calls_;
  result.factorisations = static_cast<long>(solver_.n_factorisations - factorisations_before_);
  const std::string end =
      at_rounding_ && last_relative_step_ > options_.relative_step
          ? fmt::format("relative step {:.2g} > {:.2g}, but the rates are zero to rounding",
                        last_relative_step_, options_.relative_step)
          : fmt::format("relative step {:.2g} <= {:.2g}", last_relative_step_,
                        options_.relative_step);
  result.how = fmt::format(
      "settled after {:.4g} d of loose integration ({} steps), then {} Newton "
      "steps: {}, largest relative rate {:.2g} 1/d",
      t_, steps_, newton_steps_, end, residual_);
  return result;
}

Failure SteadySearch::unsettled() const {
  std::size_t worst = 0;
  double largest = -1.0;
  for (std::size_t i = 0; i < n_; ++i) {
    const double relative = std::abs(change_[i]) / faded_size(i);
    if (relative > largest) {
      largest = relative;
      worst = i;
    }
  }
  Failure failure = failure_at(
      system_, worst, t_,
      fmt::format("no steady state within {:g} d: the largest relative rate is still {:.3g} 1/d",
                  options_.longest_time, largest),
      kTry);
  failure.got_done = fmt::format("{} steps were done. {}", steps_, newton_failure_);
  return failure;
}

}  // namespace

Result<SteadyReport> find_steady_state(DaeSystem& system, LinearSolver& solver,
                                       const SteadyOptions& options, std::span<double> y) {
  SZ_REQUIRE(y.size() == system.n_unknowns(), "y {} of {}", y.size(), system.n_unknowns());
  SZ_REQUIRE(options.longest_time > 0.0 && options.relative_step > 0.0,
             "longest time {}, relative step {}", options.longest_time, options.relative_step);
  return SteadySearch(system, solver, options, y).run();
}

}  // namespace stillzone::core
