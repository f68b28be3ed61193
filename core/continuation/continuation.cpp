#include "core/continuation/continuation.hpp"

#include <fmt/format.h>

#include <algorithm>
#include <cmath>
#include <string>
#include <utility>

#include "core/dae/evaluation.hpp"
#include "core/require.hpp"

namespace stillzone::core {

namespace {

/// An unknown that has fallen to this share of its peak on the branch counts by this share.
constexpr double kFadedShare = 0.02;
/// Steps whose tangents make a sharper turn than this are shortened (cosine).
constexpr double kSharpestTurn = 0.9;
constexpr int kEasyNewton = 3;
constexpr int kHardNewton = 6;
constexpr int kMostFoldSteps = 60;

}  // namespace

Continuation::Continuation(ParametricSystem& parametric, LinearSolver& solver,
                           const ContinuationOptions& options)
    : parametric_(parametric),
      solver_(solver),
      options_(options),
      n_(parametric.system().n_unknowns()),
      next_step_(options.first_step),
      scale_(n_, 1.0),
      peak_(n_, 0.0),
      zeros_(n_, 0.0),
      jacobian_(static_cast<std::size_t>(parametric.system().pattern().n_entries())),
      f_(n_),
      df_(n_),
      trial_(n_) {
  SZ_REQUIRE(options.first_step > 0.0 && options.longest_step >= options.first_step,
             "steps {} .. {}", options.first_step, options.longest_step);
}

void Continuation::set_scales(std::span<const double> y, double parameter) {
  const auto floors = parametric_.system().floors();
  for (std::size_t i = 0; i < n_; ++i) {
    peak_[i] = std::max(peak_[i], std::abs(y[i]));
    scale_[i] = std::max({std::abs(y[i]), floors[i], kFadedShare * peak_[i]});
  }
  scale_p_ = std::max(std::abs(parameter), 1e-3);
}

double Continuation::dot(std::span<const double> a, double ap, std::span<const double> b,
                         double bp) const {
  double sum = 0.0;
  for (std::size_t i = 0; i < n_; ++i) sum += (a[i] / scale_[i]) * (b[i] / scale_[i]);
  return sum / static_cast<double>(n_) + (ap / scale_p_) * (bp / scale_p_);
}

Failure Continuation::failure(std::string reason, double parameter) const {
  return {.reason = fmt::format("{} (at parameter {:.6g})", reason, parameter),
          .try_this = "Look at the state there with a steady run at that value."};
}

bool Continuation::factor_at(std::span<const double> y, std::span<const double> held) {
  evaluate_jacobian(parametric_.system(), y, jacobian_);
  return all_finite(jacobian_) && solver_.factor(held.empty() ? zeros_ : held, jacobian_);
}

Result<Done> Continuation::correct(double parameter, std::span<double> y,
                                   std::span<const double> held) {
  parametric_.set_parameter(parameter);
  set_scales(y, parameter);
  double before = 0.0;
  for (int k = 0; k < 3 * options_.most_newton_steps; ++k) {
    evaluate_rates(parametric_.system(), y, f_);
    if (!all_finite(f_)) return failure("the rates are not finite", parameter);
    if (!factor_at(y, held)) return failure("the steady-state matrix is singular", parameter);
    solver_.solve(f_);
    ++n_newton_steps;
    double largest = 0.0;
    for (std::size_t i = 0; i < n_; ++i) {
      y[i] += f_[i];
      largest = std::max(largest, std::abs(f_[i]) / scale_[i]);
    }
    if (!std::isfinite(largest) || largest > 1e6) break;
    const bool rounding = largest < 1e-8 && k > 1 && largest > 0.25 * before;
    if (largest <= options_.relative_step || rounding) return Done{};
    before = largest;
  }
  return failure("Newton does not converge to a steady state", parameter);
}

/// The branch's direction: J b = -df/dp, t = +-(b, 1) / |(b, 1)|.
bool Continuation::find_tangent(BranchPoint& point, const BranchPoint* before, double direction) {
  parametric_.set_parameter(point.parameter);
  if (!factor_at(point.y, {})) return false;
  point.tangent.resize(n_);
  parametric_.parameter_derivative(point.y, point.tangent);
  solver_.solve(point.tangent);
  if (!all_finite(point.tangent)) return false;
  set_scales(point.y, point.parameter);
  point.tangent_parameter = 1.0;
  double size = std::sqrt(dot(point.tangent, 1.0, point.tangent, 1.0));
  if (before == nullptr) {
    size = std::copysign(size, direction);
  } else {
    const double same = dot(point.tangent, 1.0, before->tangent, before->tangent_parameter);
    if (same < 0.0) size = -size;
  }
  for (double& value : point.tangent) value /= size;
  point.tangent_parameter /= size;
  return true;
}

Result<BranchPoint> Continuation::start(std::span<const double> y, double parameter,
                                        double direction) {
  BranchPoint point;
  point.y.assign(y.begin(), y.end());
  point.parameter = parameter;
  if (auto done = correct(parameter, point.y); !done) return done.failure();
  if (!find_tangent(point, nullptr, direction)) {
    return failure("the steady-state matrix is singular", parameter);
  }
  next_step_ = options_.first_step;
  return point;
}

Result<BranchPoint> Continuation::at_distance(const BranchPoint& from, double h) {
  set_scales(from.y, from.parameter);
  BranchPoint to;
  to.y.resize(n_);
  for (std::size_t i = 0; i < n_; ++i) to.y[i] = from.y[i] + h * from.tangent[i];
  to.parameter = from.parameter + h * from.tangent_parameter;
  double before = 0.0;
  for (int k = 0; k < options_.most_newton_steps; ++k) {
    parametric_.set_parameter(to.parameter);
    evaluate_rates(parametric_.system(), to.y, f_);
    if (!all_finite(f_)) return failure("the rates are not finite", to.parameter);
    if (!factor_at(to.y, {})) return failure("the matrix is singular", to.parameter);
    parametric_.parameter_derivative(to.y, df_);
    solver_.solve(f_);   // J a = -f
    solver_.solve(df_);  // J b = -df/dp
    for (std::size_t i = 0; i < n_; ++i) trial_[i] = to.y[i] - from.y[i];
    const double off =
        dot(from.tangent, from.tangent_parameter, trial_, to.parameter - from.parameter) - h;
    const double along_a = dot(from.tangent, from.tangent_parameter, f_, 0.0);
    const double along_b = dot(from.tangent, from.tangent_parameter, df_, 1.0);
    const double dp = (-off - along_a) / along_b;
    double largest = std::abs(dp) / scale_p_;
    for (std::size_t i = 0; i < n_; ++i) {
      const double dy = f_[i] + dp * df_[i];
      to.y[i] += dy;
      largest = std::max(largest, std::abs(dy) / scale_[i]);
    }
    to.parameter += dp;
    ++n_newton_steps;
    if (!std::isfinite(largest) || largest > 1.0) break;
    const bool rounding = largest < 1e-8 && k > 1 && largest > 0.25 * before;
    if (largest <= options_.relative_step || rounding) {
      if (!find_tangent(to, &from, 0.0)) {
        return failure("the matrix is singular at a steady state", to.parameter);
      }
      if (k <= kEasyNewton) next_step_ = std::min(1.5 * h, options_.longest_step);
      if (k >= kHardNewton) next_step_ = 0.6 * h;
      return to;
    }
    before = largest;
  }
  return failure("Newton does not converge along the branch", from.parameter);
}

Result<BranchPoint> Continuation::advance(const BranchPoint& from) {
  double h = std::min(next_step_, options_.longest_step);
  while (true) {
    auto to = at_distance(from, h);
    if (to) {
      const double turn = dot(to.value().tangent, to.value().tangent_parameter, from.tangent,
                              from.tangent_parameter) /
                          std::sqrt(dot(from.tangent, from.tangent_parameter, from.tangent,
                                        from.tangent_parameter));
      if (turn > kSharpestTurn || h < 100.0 * options_.shortest_step) {
        last_step_ = h;
        if (turn < 0.97) next_step_ = std::min(next_step_, h);
        return to;
      }
    }
    h *= 0.5;
    if (h < options_.shortest_step) {
      Failure given_up = failure("the branch cannot be followed further", from.parameter);
      if (!to) given_up.got_done = to.failure().reason;
      return given_up;
    }
  }
}

/// Illinois false position on the parameter's part of the tangent.
Result<BranchPoint> Continuation::locate_fold(const BranchPoint& from, const BranchPoint& to,
                                              double distance) {
  SZ_REQUIRE(from.tangent_parameter * to.tangent_parameter <= 0.0, "tangents {} and {}",
             from.tangent_parameter, to.tangent_parameter);
  double low = 0.0;
  double high = distance;
  double at_low = from.tangent_parameter;
  double at_high = to.tangent_parameter;
  BranchPoint best = std::abs(at_low) < std::abs(at_high) ? from : to;
  int last_side = 0;
  for (int k = 0; k < kMostFoldSteps; ++k) {
    const double h = (low * at_high - high * at_low) / (at_high - at_low);
    auto point = at_distance(from, h);
    if (!point) break;  // at the fold itself to rounding: the best so far stands
    const double here = point.value().tangent_parameter;
    if (std::abs(here) <= std::abs(best.tangent_parameter)) best = std::move(point).value();
    if (std::abs(best.tangent_parameter) < 1e-13 * scale_p_ || high - low < 1e-12 * distance) break;
    const int side = here * at_low > 0.0 ? 1 : -1;
    if (side > 0) {
      low = h;
      at_low = here;
      if (last_side > 0) at_high *= 0.5;
    } else {
      high = h;
      at_high = here;
      if (last_side < 0) at_low *= 0.5;
    }
    last_side = side;
  }
  if (std::abs(best.tangent_parameter) > 1e-4 * scale_p_) {
    return failure("the fold was seen but not located", best.parameter);
  }
  return best;
}

}  // namespace stillzone::core
