#pragma once

#include <span>
#include <vector>

#include "core/continuation/parametric_system.hpp"
#include "core/dae/linear_solver.hpp"
#include "core/result.hpp"

namespace stillzone::core {

/// A steady state on a branch: f(y, parameter) = 0.
struct BranchPoint {
  std::vector<double> y;
  double parameter = 0.0;
  /// Unit tangent of the branch, in the scaled norm of its point; tangent_parameter changes sign
  /// at a fold.
  std::vector<double> tangent;
  double tangent_parameter = 0.0;
};

struct ContinuationOptions {
  double first_step = 0.02;     ///< scaled arc length, > 0; 0.02 = changes of some percent
  double longest_step = 0.15;   ///< > first_step
  double shortest_step = 1e-7;  ///< below it the branch is given up
  /// Newton is finished when the largest relative step |dy_i| / scale_i is below this.
  double relative_step = 1e-11;
  int most_newton_steps = 10;
};

/// Follows a branch of steady states by pseudo-arclength continuation: a step along the tangent,
/// then Newton on
///   f(y, p) = 0,   <t, (y, p) - (y0, p0)> = h
/// with the exact Jacobian and the exact derivative in p. Each bordered system is solved by block
/// elimination, two solves with the factors of df/dy; folds are passed without noticing.
/// Source: Keller (1977), Numerical solution of bifurcation and nonlinear eigenvalue problems, in
/// Rabinowitz (ed.), Applications of Bifurcation Theory.
///
/// Norm: |(v, w)|^2 = mean_i (v_i / scale_i)^2 + (w / scale_p)^2 with scale_i the largest of |y_i|,
/// the unknown's floor, and a fiftieth of its peak on the branch; scale_p = |p|.
class Continuation {
 public:
  /// All must outlive this object.
  Continuation(ParametricSystem& parametric, LinearSolver& solver,
               const ContinuationOptions& options);

  /// Newton from y at a fixed parameter, then the tangent. @param direction > 0: towards larger
  /// parameters. Resets the step length.
  [[nodiscard]] Result<BranchPoint> start(std::span<const double> y, double parameter,
                                          double direction);
  /// One step on from a point of the branch; the step length is adapted to how easily Newton
  /// converges and how far the tangent turns.
  [[nodiscard]] Result<BranchPoint> advance(const BranchPoint& from);
  /// The point at arc length h after `from`, without adaptation.
  [[nodiscard]] Result<BranchPoint> at_distance(const BranchPoint& from, double h);
  /// Arc length of the last successful advance().
  [[nodiscard]] double last_step() const { return last_step_; }
  /// Largest parameter step allowed at once, relative; for a caller that must not step over.
  void shorten_to(double h) { next_step_ = h; }

  /// The fold between `from` and the point last_step() after it, where tangent_parameter is 0.
  /// The parameter is extreme there, so its error is of second order in the arc length's.
  [[nodiscard]] Result<BranchPoint> locate_fold(const BranchPoint& from, const BranchPoint& to,
                                                double distance);

  /// Newton at a fixed parameter; y in and out. @param held size n or empty: unknowns with 1 are 0
  /// and stay 0 (their own equation is fulfilled by 0); their row is kept regular, so that the
  /// state can be found also where the held unknowns' block is singular.
  [[nodiscard]] Result<Done> correct(double parameter, std::span<double> y,
                                     std::span<const double> held = {});

  long n_newton_steps = 0;

 private:
  [[nodiscard]] bool factor_at(std::span<const double> y, std::span<const double> held);
  [[nodiscard]] bool find_tangent(BranchPoint& point, const BranchPoint* before, double direction);
  void set_scales(std::span<const double> y, double parameter);
  [[nodiscard]] double dot(std::span<const double> a, double ap, std::span<const double> b,
                           double bp) const;
  [[nodiscard]] Failure failure(std::string reason, double parameter) const;

  ParametricSystem& parametric_;
  LinearSolver& solver_;
  ContinuationOptions options_;
  std::size_t n_;
  double next_step_;
  double last_step_ = 0.0;
  double scale_p_ = 1.0;
  std::vector<double> scale_, peak_, zeros_, jacobian_, f_, df_, trial_;
};

}  // namespace stillzone::core
