#include "network/tracer/residual_tests.hpp"

#include <fmt/format.h>

#include <algorithm>
#include <boost/math/distributions/chi_squared.hpp>
#include <boost/math/distributions/students_t.hpp>
#include <boost/math/special_functions/gamma.hpp>
#include <cmath>

namespace stillzone::network {
namespace {

double log_choose(std::size_t n, std::size_t k) {
  const auto lg = [](std::size_t m) { return boost::math::lgamma(static_cast<double>(m) + 1.0); };
  return lg(n) - lg(k) - lg(n - k);
}

double choose_product(std::size_t a, std::size_t i, std::size_t b, std::size_t j,
                      double log_total) {
  if (i > a || j > b) return 0.0;
  return std::exp(log_choose(a, i) + log_choose(b, j) - log_total);
}

void test_runs(std::span<const double> residuals, ResidualTests& tests) {
  std::size_t n_plus = 0;
  tests.n_runs = residuals.empty() ? 0 : 1;
  for (std::size_t i = 0; i < residuals.size(); ++i) {
    if (residuals[i] > 0.0) ++n_plus;
    if (i > 0 && (residuals[i] > 0.0) != (residuals[i - 1] > 0.0)) ++tests.n_runs;
  }
  const std::size_t n_minus = residuals.size() - n_plus;
  if (residuals.size() < 8 || n_plus == 0 || n_minus == 0) return;
  tests.runs_p = runs_at_most(tests.n_runs, n_plus, n_minus);
  if (*tests.runs_p < 0.05) {
    tests.words.push_back(fmt::format(
        "The residuals keep one sign too long ({} runs; chance {:.2g} if the model were right): "
        "the model misses something the samples show.",
        tests.n_runs, *tests.runs_p));
  }
}

void test_scatter(double sum_of_squares, long degrees_of_freedom, ResidualTests& tests) {
  const boost::math::chi_squared law(static_cast<double>(degrees_of_freedom));
  const double below = boost::math::cdf(law, sum_of_squares);
  tests.scatter_p = 2.0 * std::min(below, 1.0 - below);
  const double deviation = std::sqrt(sum_of_squares / static_cast<double>(degrees_of_freedom));
  if (tests.scatter_p >= 0.05) return;
  if (deviation > 1.0) {
    tests.words.push_back(fmt::format(
        "The samples scatter {:.1f} times as wide about the fit as their stated error: the model "
        "is wrong somewhere, or the error is stated too small. Intervals follow the scatter seen.",
        deviation));
  } else {
    tests.words.push_back(fmt::format(
        "The samples lie closer to the fit ({:.2f} times) than their stated error: the error is "
        "stated too large. Intervals follow the scatter seen.",
        deviation));
  }
}

void find_outlier(std::span<const double> residuals, double deviation, long degrees_of_freedom,
                  ResidualTests& tests) {
  if (residuals.size() < 5 || !(deviation > 0.0)) return;
  std::size_t furthest = 0;
  for (std::size_t i = 1; i < residuals.size(); ++i) {
    if (std::abs(residuals[i]) > std::abs(residuals[furthest])) furthest = i;
  }
  const boost::math::students_t law(static_cast<double>(degrees_of_freedom));
  const double limit =
      boost::math::quantile(law, 1.0 - 0.025 / static_cast<double>(residuals.size()));
  if (std::abs(residuals[furthest]) > limit * deviation) tests.outlier = furthest;
}

}  // namespace

double runs_at_most(std::size_t n_runs, std::size_t n_plus, std::size_t n_minus) {
  const double log_total = log_choose(n_plus + n_minus, n_plus);
  double sum = 0.0;
  for (std::size_t runs = 2; runs <= n_runs; ++runs) {
    const std::size_t half = runs / 2;
    if (runs % 2 == 0) {
      sum += 2.0 * choose_product(n_plus - 1, half - 1, n_minus - 1, half - 1, log_total);
    } else {
      sum += choose_product(n_plus - 1, half, n_minus - 1, half - 1, log_total) +
             choose_product(n_plus - 1, half - 1, n_minus - 1, half, log_total);
    }
  }
  return std::min(sum, 1.0);
}

ResidualTests residual_tests(std::span<const double> residuals, long degrees_of_freedom) {
  ResidualTests tests;
  if (degrees_of_freedom <= 0) return tests;
  double sum_of_squares = 0.0;
  for (const double residual : residuals) sum_of_squares += residual * residual;
  test_runs(residuals, tests);
  test_scatter(sum_of_squares, degrees_of_freedom, tests);
  find_outlier(residuals, std::sqrt(sum_of_squares / static_cast<double>(degrees_of_freedom)),
               degrees_of_freedom, tests);
  return tests;
}

}  // namespace stillzone::network
