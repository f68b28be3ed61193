#pragma once

#include <cstddef>
#include <span>
#include <vector>

#include "core/dae/dae_system.hpp"
#include "core/dae/linear_solver.hpp"

namespace stillzone::core {

/// One step of RODAS4 on M y' = f(y), q' = g(y), without any choice of step size: used by the
/// one-step integrator and by the steady-state search. Allocates in the constructor only.
class RosenbrockStep {
 public:
  enum class Outcome {
    done,        ///< a finite trial state and error
    not_finite,  ///< rates, Jacobian or trial state not finite; see culprit()
    singular,    ///< (M / (h gamma) - J) is singular; culprit() is the column
  };

  /// Both must outlive this object. Weights of the error: 1 / (rtol * (max(|y0|, |y1|) + floor)).
  RosenbrockStep(DaeSystem& system, LinearSolver& solver, double relative_tolerance);

  /// Evaluates rates and Jacobian at y; all attempts until the next begin() start there.
  [[nodiscard]] Outcome begin(std::span<const double> y);
  /// One factorisation, six stages. h > 0 [d].
  [[nodiscard]] Outcome attempt(double h);

  /// After a done attempt: the state at the end, and the root mean square of the weighted error
  /// (<= 1 meets the tolerance).
  [[nodiscard]] std::span<const double> state() const { return y1_; }
  [[nodiscard]] double error() const { return error_; }
  /// The unknown with the largest weighted error of the last done attempt.
  [[nodiscard]] std::size_t worst_unknown() const;
  /// The unknown at fault after an outcome that is not done.
  [[nodiscard]] std::size_t culprit() const { return culprit_; }
  /// f at the start of the step.
  [[nodiscard]] std::span<const double> rates() const { return f0_; }
  [[nodiscard]] std::span<const double> mass() const { return mass_; }
  /// df/dy there.
  [[nodiscard]] std::span<const double> jacobian() const { return jacobian_; }

  /// Adds to q what the attempted step adds: the stages' formula, so that a linear invariant of y
  /// and q holds to rounding. Call once per accepted step, before dense_quadratures.
  void advance_quadratures(std::span<double> q);
  /// y and q at start + s h, 0 <= s <= 1; order 3. q_start: q before the step.
  void dense_state(double s, std::span<double> y) const;
  void dense_quadratures(double s, std::span<const double> q_start, std::span<double> q);

  /// Steps' evaluations so far.
  long rate_calls = 0;
  long jacobian_calls = 0;

 private:
  template <int Stage>
  void stage(double h);
  void estimate_error();
  void find_culprit();
  void weigh_quadratures(std::span<const double> weights, std::span<double> sum);

  DaeSystem& system_;
  LinearSolver& solver_;
  double relative_tolerance_;
  std::size_t n_;
  std::size_t n_quadratures_;
  double h_ = 0.0;
  double error_ = 0.0;
  std::size_t culprit_ = 0;
  bool dense_ready_ = false;
  std::vector<double> mass_, floors_, diagonal_, jacobian_;
  std::vector<double> f0_, y1_, zeros_, direction_;
  std::vector<double> states_;  // 6 x n: the states at which the stages are evaluated
  std::vector<double> u_;       // 6 x n: the stages' increments
  std::vector<double> g_;       // 6 x n_quadratures
  std::vector<double> increment_, dense2_, dense3_, along_;  // n_quadratures
};

}  // namespace stillzone::core
