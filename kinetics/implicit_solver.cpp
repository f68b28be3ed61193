#include "kinetics/implicit_solver.hpp"

#include <fmt/format.h>

#include <Eigen/Dense>
#include <algorithm>
#include <cmath>
#include <limits>

namespace stillzone::kinetics {

namespace {

constexpr double kEpsilon = std::numeric_limits<double>::epsilon();
constexpr int kMaxSteps = 200;

double usable_start(const Implicit& implicit, double value) {
  if (std::isfinite(value) && value >= implicit.low && value <= implicit.high) return value;
  return std::clamp(implicit.start, implicit.low, implicit.high);
}

core::Failure failure_of(const Implicit& implicit, std::string reason) {
  core::Failure failure;
  failure.reason = std::move(reason);
  failure.quantity = implicit.name;
  failure.try_this =
      "Check the concentrations its equation is made of, such as the ions of the feed.";
  return failure;
}

core::Result<core::Done> solve_one(const Implicit& implicit, double& value,
                                   const ImplicitFunction& evaluate) {
  double residual = 0.0;
  double slope = 0.0;
  const auto at = [&](double x) {
    evaluate({&x, 1}, {&residual, 1}, {&slope, 1});
    return residual;
  };
  double low = implicit.low;
  double high = implicit.high;
  const double at_low = at(low);
  const double at_high = at(high);
  if (!std::isfinite(at_low) || !std::isfinite(at_high) || at_low * at_high > 0.0) {
    return failure_of(implicit, fmt::format("{0} has no root between {1:g} and {2:g}: its residual "
                                            "is {3:g} at {1:g} and {4:g} at {2:g}",
                                            implicit.name, low, high, at_low, at_high));
  }
  // A root at an end of the range is that end: steps below only come near it.
  if (!(at_low < 0.0) && !(at_low > 0.0)) {
    value = low;
    return core::Done{};
  }
  if (!(at_high < 0.0) && !(at_high > 0.0)) {
    value = high;
    return core::Done{};
  }
  const double sign = at_low > 0.0 ? -1.0 : 1.0;  // rising once multiplied by it
  double x = usable_start(implicit, value);
  double last_width = high - low;
  for (int i = 0; i < kMaxSteps; ++i) {
    const double f = sign * at(x);
    if (!std::isfinite(f)) {
      return failure_of(
          implicit, fmt::format("the equation of {} is not a number at {:g}", implicit.name, x));
    }
    if (!(f < 0.0) && !(f > 0.0)) break;
    (f < 0.0 ? low : high) = x;
    double next = x - f / (sign * slope);
    // Every second step at least halves the bracket or is a small Newton step.
    const bool slow = i % 4 == 3 && high - low > 0.5 * last_width;
    if (i % 4 == 3) last_width = high - low;
    const bool small = std::abs(next - x) <= 1e-3 * (high - low);
    if (!(next > low && next < high) || (slow && !small)) next = 0.5 * (low + high);
    const double change = std::abs(next - x);
    x = next;
    if (change <= kEpsilon * std::abs(x)) break;
  }
  value = x;
  return core::Done{};
}

class SeveralUnknowns {
 public:
  SeveralUnknowns(const std::vector<Implicit>& implicits, std::span<double> values,
                  const ImplicitFunction& evaluate)
      : implicits_(implicits), values_(values), evaluate_(evaluate) {}

  core::Result<core::Done> solve() {
    const auto n = static_cast<Eigen::Index>(implicits_.size());
    x_.resize(n);
    for (Eigen::Index i = 0; i < n; ++i) x_[i] = usable_start(implicit(i), values_[index(i)]);
    f_.resize(n);
    jacobian_.resize(n, n);
    if (!evaluate_at(x_)) {
      return failure_of(implicits_[0], "the implicit equations are not a number at their start");
    }
    for (int step = 0; step < kMaxSteps; ++step) {
      const Eigen::VectorXd change = jacobian_.partialPivLu().solve(-f_);
      if (!change.allFinite()) return failed("the implicit equations have a singular Jacobian");
      const double length = relative(change);
      if (f_.cwiseAbs().maxCoeff() <= 0.0 || !move_by(change)) {
        // No shorter step helps: at the root to rounding, or stuck.
        if (length <= 1e-9) return keep();
        return failed("the implicit equations have no solution inside their ranges");
      }
      if (length <= 2.0 * kEpsilon) return keep();
    }
    return failed("the implicit equations did not converge");
  }

 private:
  static std::size_t index(Eigen::Index i) { return static_cast<std::size_t>(i); }
  [[nodiscard]] const Implicit& implicit(Eigen::Index i) const { return implicits_[index(i)]; }

  bool evaluate_at(const Eigen::VectorXd& x) {
    const auto n = implicits_.size();
    evaluate_({x.data(), n}, {f_.data(), n}, {jacobian_.data(), n * n});
    return f_.allFinite() && jacobian_.allFinite();
  }
  [[nodiscard]] double relative(const Eigen::VectorXd& change) const {
    return change.cwiseAbs().cwiseQuotient(x_.cwiseAbs().array().max(1e-300).matrix()).maxCoeff();
  }
  /// Takes the longest of the steps 1, 1/2, 1/4 ... that stays in the ranges and lowers the
  /// residuals, scaled as they were at the start of the step.
  bool move_by(const Eigen::VectorXd& change) {
    const Eigen::VectorXd scale = jacobian_.cwiseAbs().rowwise().sum().cwiseInverse().unaryExpr(
        [](double s) { return std::isfinite(s) ? s : 1.0; });
    const double before = f_.cwiseProduct(scale).norm();
    const Eigen::VectorXd start = x_;
    for (double part = 1.0; part > 1e-10; part *= 0.5) {
      x_ = start + part * change;
      for (Eigen::Index i = 0; i < x_.size(); ++i) {
        x_[i] = std::clamp(x_[i], implicit(i).low, implicit(i).high);
      }
      if (evaluate_at(x_) && f_.cwiseProduct(scale).norm() < before) return true;
    }
    x_ = start;
    evaluate_at(x_);
    return false;
  }
  core::Result<core::Done> keep() {
    for (Eigen::Index i = 0; i < x_.size(); ++i) values_[index(i)] = x_[i];
    return core::Done{};
  }
  [[nodiscard]] core::Failure failed(const std::string& what) const {
    Eigen::Index worst = 0;
    f_.cwiseAbs().maxCoeff(&worst);
    const Implicit& at_fault = implicit(worst);
    return failure_of(at_fault, fmt::format("{}; the equation of {} is off by {:g} at {:g}", what,
                                            at_fault.name, f_[worst], x_[worst]));
  }

  const std::vector<Implicit>& implicits_;
  std::span<double> values_;
  const ImplicitFunction& evaluate_;
  Eigen::VectorXd x_;
  Eigen::VectorXd f_;
  Eigen::Matrix<double, Eigen::Dynamic, Eigen::Dynamic, Eigen::RowMajor> jacobian_;
};

}  // namespace

core::Result<core::Done> solve_implicit_equations(const std::vector<Implicit>& implicits,
                                                  std::span<double> values,
                                                  const ImplicitFunction& evaluate) {
  if (implicits.size() == 1) return solve_one(implicits[0], values[0], evaluate);
  return SeveralUnknowns(implicits, values, evaluate).solve();
}

}  // namespace stillzone::kinetics
