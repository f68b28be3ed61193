#include <Eigen/Dense>
#include <boost/math/distributions/students_t.hpp>
#include <boost/math/tools/roots.hpp>
#include <cmath>
#include <limits>

#include "core/least_squares.hpp"

namespace stillzone::core {
namespace {

using Eigen::Index;
constexpr double kPi = 3.14159265358979323846;

using RowMajor = Eigen::Matrix<double, Eigen::Dynamic, Eigen::Dynamic, Eigen::RowMajor>;

/// Columns of the parameters that are free to move: those at a bound are taken as given.
std::vector<Index> free_columns(const LeastSquaresFit& fit) {
  std::vector<Index> columns;
  for (std::size_t j = 0; j < fit.at_bound.size(); ++j) {
    if (!fit.at_bound[j]) columns.push_back(static_cast<Index>(j));
  }
  return columns;
}

}  // namespace

FitUncertainty fit_uncertainty(const LeastSquaresFit& fit, std::size_t n_parameters) {
  const auto p = static_cast<Index>(n_parameters);
  const auto n = static_cast<Index>(fit.residuals.size());
  FitUncertainty result;
  result.covariance.assign(n_parameters * n_parameters, 0.0);
  result.correlation.assign(n_parameters * n_parameters, 0.0);
  result.standard_error.assign(n_parameters, 0.0);
  const std::vector<Index> columns = free_columns(fit);
  const auto n_free = static_cast<Index>(columns.size());
  result.degrees_of_freedom = static_cast<long>(fit.n_observations) - n_free;
  result.residual_deviation =
      result.degrees_of_freedom > 0
          ? std::sqrt(fit.sum_of_squares / static_cast<double>(result.degrees_of_freedom))
          : std::numeric_limits<double>::infinity();
  if (n_free == 0) return result;

  const Eigen::Map<const RowMajor> jacobian(fit.jacobian.data(), n, p);
  Eigen::MatrixXd scaled(n, n_free);
  Eigen::VectorXd scale(n_free);
  for (Index k = 0; k < n_free; ++k) {
    scaled.col(k) = jacobian.col(columns[static_cast<std::size_t>(k)]);
    scale[k] = scaled.col(k).norm();
    if (scale[k] > 0.0) scaled.col(k) /= scale[k];
  }
  const Eigen::JacobiSVD<Eigen::MatrixXd> svd(scaled, Eigen::ComputeThinV);
  const Eigen::VectorXd& singular = svd.singularValues();
  result.singular_values.assign(singular.data(), singular.data() + singular.size());
  const double limit = 1e-10 * singular[0];
  result.singular = singular.size() < n_free || !(singular[singular.size() - 1] > limit);
  Eigen::MatrixXd covariance = Eigen::MatrixXd::Zero(n_free, n_free);
  for (Index k = 0; k < singular.size(); ++k) {
    if (!(singular[k] > limit)) continue;
    const Eigen::VectorXd direction = svd.matrixV().col(k) / singular[k];
    covariance += direction * direction.transpose();
  }
  const double variance = result.residual_deviation * result.residual_deviation;
  for (Index a = 0; a < n_free; ++a) {
    for (Index b = 0; b < n_free; ++b) {
      const double entry = variance * covariance(a, b) / (scale[a] * scale[b]);
      const auto at = static_cast<std::size_t>(columns[static_cast<std::size_t>(a)] * p +
                                               columns[static_cast<std::size_t>(b)]);
      result.covariance[at] = entry;
    }
  }
  // A parameter that takes part in an undetermined combination has no standard error.
  for (Index a = 0; a < n_free; ++a) {
    const auto column = static_cast<std::size_t>(columns[static_cast<std::size_t>(a)]);
    bool determined = scale[a] > 0.0 && singular.size() == n_free;
    for (Index k = 0; determined && k < singular.size(); ++k) {
      if (!(singular[k] > limit) && std::abs(svd.matrixV()(a, k)) > 1e-6) determined = false;
    }
    result.standard_error[column] =
        determined ? std::sqrt(result.covariance[column * n_parameters + column])
                   : std::numeric_limits<double>::infinity();
  }
  for (std::size_t a = 0; a < n_parameters; ++a) {
    for (std::size_t b = 0; b < n_parameters; ++b) {
      const double product = result.standard_error[a] * result.standard_error[b];
      result.correlation[a * n_parameters + b] =
          product > 0.0 && std::isfinite(product)
              ? result.covariance[a * n_parameters + b] / product
              : 0.0;
    }
  }
  return result;
}

namespace {

/// The signed root of the profile's F statistic as a function of the held parameter: near to a
/// straight line, zero at the fit (Bates and Watts 1988, Nonlinear Regression Analysis, ch. 6).
class Profile {
 public:
  Profile(const ResidualFunction& function, std::span<const FitParameter> parameters,
          const LeastSquaresFit& fit, std::size_t held, double deviation,
          const LeastSquaresOptions& options)
      : function_(function),
        parameters_(parameters.begin(), parameters.end()),
        fit_(fit),
        held_(held),
        deviation_(deviation),
        options_(options),
        nearest_(fit.parameters) {
    options_.more_starts.clear();
  }

  /// Empty when the refit fails.
  std::optional<double> signed_root(double value) {
    for (std::size_t j = 0; j < parameters_.size(); ++j) parameters_[j].start = nearest_[j];
    const FitParameter kept = parameters_[held_];
    parameters_[held_].start = parameters_[held_].low = parameters_[held_].high = value;
    // Next to the last solution first; from afar only when that fails.
    LeastSquaresOptions options = options_;
    options.accept_plateau = true;
    options.timid_steps_too = false;
    auto refit = fit_least_squares(function_, parameters_, options);
    if (!refit) {
      options.timid_steps_too = true;
      options.more_starts.push_back(fit_.parameters);
      refit = fit_least_squares(function_, parameters_, options);
    }
    parameters_[held_] = kept;
    if (!refit) return std::nullopt;
    nearest_ = refit.value().parameters;
    const double rise = refit.value().sum_of_squares - fit_.sum_of_squares;
    if (rise < -1e-6 * fit_.sum_of_squares) better_ = true;
    const double root = std::sqrt(std::max(rise, 0.0)) / deviation_;
    return value < fit_.parameters[held_] ? -root : root;
  }
  void restart() { nearest_ = fit_.parameters; }
  [[nodiscard]] bool better() const { return better_; }

 private:
  const ResidualFunction& function_;
  std::vector<FitParameter> parameters_;
  const LeastSquaresFit& fit_;
  std::size_t held_;
  double deviation_;
  LeastSquaresOptions options_;
  std::vector<double> nearest_;
  bool better_ = false;
};

/// Walks outwards from the fit until the profile crosses the limit, then closes in.
std::optional<double> profile_end(Profile& profile, double centre, double step, double bound,
                                  double limit) {
  profile.restart();
  double inside = centre;
  double inside_excess = -limit;
  const double direction = step < 0.0 ? -1.0 : 1.0;
  double outside = centre + step;
  for (int k = 0; k < 60; ++k) {
    const bool past = direction * (outside - bound) >= 0.0;
    if (past) outside = bound;
    const auto root = profile.signed_root(outside);
    if (!root) return std::nullopt;
    if (std::abs(*root) >= limit) {
      const auto excess = [&](double x) {
        const auto r = profile.signed_root(x);
        return (r ? std::abs(*r) : limit * 1e3) - limit;
      };
      std::uintmax_t most = 60;
      const auto close = [](double a, double b) {
        return std::abs(a - b) <= 1e-5 * (std::abs(a) + std::abs(b));
      };
      // The ends' values are kept as they were found: a refit on another way there may differ.
      const double outside_excess = std::abs(*root) - limit;
      if (!(outside_excess > 0.0)) return outside;
      const bool upwards = inside < outside;
      const auto [a, b] = boost::math::tools::toms748_solve(
          excess, upwards ? inside : outside, upwards ? outside : inside,
          upwards ? inside_excess : outside_excess, upwards ? outside_excess : inside_excess, close,
          most);
      return 0.5 * (a + b);
    }
    if (past) return std::nullopt;
    inside = outside;
    inside_excess = std::abs(*root) - limit;
    outside = centre + 1.6 * (outside - centre);
  }
  return std::nullopt;
}

}  // namespace

ProfileInterval profile_interval(const ResidualFunction& function,
                                 std::span<const FitParameter> parameters,
                                 const LeastSquaresFit& fit, std::size_t parameter,
                                 double confidence, const LeastSquaresOptions& options) {
  SZ_REQUIRE(parameter < parameters.size() && confidence > 0.0 && confidence < 1.0,
             "parameter {} confidence {}", parameter, confidence);
  const FitUncertainty uncertainty = fit_uncertainty(fit, parameters.size());
  ProfileInterval interval;
  if (uncertainty.degrees_of_freedom <= 0) return interval;
  const boost::math::students_t distribution(static_cast<double>(uncertainty.degrees_of_freedom));
  const double limit = boost::math::quantile(distribution, 0.5 + 0.5 * confidence);
  const double centre = fit.parameters[parameter];
  const FitParameter& range = parameters[parameter];
  double step = uncertainty.standard_error[parameter];
  const double width = range.high - range.low;
  if (!std::isfinite(step) || !(step > 0.0)) {
    step = std::isfinite(width) ? 0.05 * width : 0.1 * (std::abs(centre) + 1e-12);
  }
  if (std::isfinite(width)) step = std::min(step, 0.5 * width);
  Profile profile(function, parameters, fit, parameter, uncertainty.residual_deviation, options);
  if (centre > range.low) interval.low = profile_end(profile, centre, -step, range.low, limit);
  if (centre < range.high) interval.high = profile_end(profile, centre, step, range.high, limit);
  interval.better_minimum_found = profile.better();
  return interval;
}

double corrected_akaike(double sum_of_squares, std::size_t n_residuals, std::size_t n_parameters) {
  const auto n = static_cast<double>(n_residuals);
  const auto k = static_cast<double>(n_parameters + 1);
  if (n <= k + 1.0) return std::numeric_limits<double>::infinity();
  return n * (std::log(2.0 * kPi * sum_of_squares / n) + 1.0) + 2.0 * k +
         2.0 * k * (k + 1.0) / (n - k - 1.0);
}

}  // namespace stillzone::core
