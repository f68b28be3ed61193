#include "network/tracer/gamma_law.hpp"

#include <boost/math/special_functions/digamma.hpp>
#include <boost/math/special_functions/gamma.hpp>
#include <cmath>

namespace stillzone::network {
namespace {

/// dP/da = sum over k of t_k (ln x - digamma(a + k + 1)), t_k = x^(a+k) e^-x / Gamma(a+k+1) > 0.
/// Terms grow until a + k ~ x and then fall off; digamma follows its recurrence.
double shape_derivative(double a, double x) {
  const double log_x = std::log(x);
  double digamma = boost::math::digamma(a + 1.0);
  double log_term = a * log_x - x - std::lgamma(a + 1.0);
  double sum = 0.0;
  for (int k = 0; k < 100000; ++k) {
    const double term = std::exp(log_term);
    sum += term * (log_x - digamma);
    const double next = a + k + 1.0;
    if (next > x && term < 1e-18 * (std::abs(sum) + 1e-300)) break;
    digamma += 1.0 / next;
    log_term += log_x - std::log(next);
  }
  return sum;
}

}  // namespace

GammaValue gamma_law(double shape, double x) {
  if (!(x > 0.0)) return {};
  GammaValue result;
  result.value = boost::math::gamma_p(shape, x);
  result.by_x = std::exp((shape - 1.0) * std::log(x) - x - std::lgamma(shape));
  // Far up the tail P = 1 to rounding, and so for shapes nearby.
  result.by_shape = x > shape + 40.0 * std::sqrt(shape) + 60.0 ? 0.0 : shape_derivative(shape, x);
  return result;
}

GammaValue gamma_law_density(double shape, double x) {
  GammaValue result;
  if (!(x > 0.0)) {
    // At x = 0: e^-x for one tank, 0 for more; a density of less than one tank has a pole there.
    result.value = shape > 1.0 ? 0.0 : (shape < 1.0 ? HUGE_VAL : 1.0);
    return result;
  }
  result.value = std::exp((shape - 1.0) * std::log(x) - x - std::lgamma(shape));
  result.by_shape = result.value * (std::log(x) - boost::math::digamma(shape));
  result.by_x = result.value * ((shape - 1.0) / x - 1.0);
  return result;
}

}  // namespace stillzone::network
