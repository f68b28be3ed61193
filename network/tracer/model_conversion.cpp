#include "network/tracer/model_conversion.hpp"

#include <algorithm>
#include <array>
#include <boost/math/quadrature/gauss_kronrod.hpp>
#include <boost/numeric/odeint.hpp>
#include <cmath>

namespace stillzone::network {

double second_order_segregated(const RtdModel& model, std::span<const double> p, double k,
                               double tolerance) {
  // By parts, so that what passes at one instant is counted exactly: 1 + integral of (1-F) g',
  // g = 1/(1 + K theta).
  const auto lost = [&](double theta) {
    const double older = 1.0 - model.step_response(p, theta, {});
    return older * k / ((1.0 + k * theta) * (1.0 + k * theta));
  };
  using Rule = boost::math::quadrature::gauss_kronrod<double, 31>;
  // Behind the oldest the integrand is nothing; in two pieces, the early one finely.
  const double middle = quantile(model, p, 0.5);
  const double oldest = quantile(model, p, 1.0 - 0.01 * tolerance);
  double sum = 0.0;
  if (middle > 0.0) sum += Rule::integrate(lost, 0.0, middle, 8, tolerance);
  sum += Rule::integrate(lost, middle, oldest, 8, tolerance);
  return 1.0 - sum;
}

double second_order_maximum_mixedness(const RtdModel& model, std::span<const double> p, double k,
                                      double tolerance) {
  namespace odeint = boost::numeric::odeint;
  const double oldest = quantile(model, p, 1.0 - std::max(1e-9, 0.01 * tolerance));
  const auto hazard = [&](double age) {
    const double older = std::max(1.0 - model.step_response(p, age, {}), 1e-13);
    return model.density(p, age, {}) / older;
  };
  // Among the oldest the hazard hardly changes: K c^2 = h (1 - c) is where they stand.
  const double h = hazard(oldest);
  std::array<double, 1> left = {2.0 / (1.0 + std::sqrt(1.0 + 4.0 * k / h))};
  const auto slope = [&](const std::array<double, 1>& c, std::array<double, 1>& rate, double age) {
    rate[0] = k * c[0] * c[0] - hazard(std::max(age, 0.0)) * (1.0 - c[0]);
  };
  using Stepper = odeint::runge_kutta_dopri5<std::array<double, 1>>;
  odeint::integrate_adaptive(odeint::make_controlled<Stepper>(0.1 * tolerance, 0.1 * tolerance),
                             slope, left, oldest, 0.0, -1e-3 * oldest);
  for (const RtdImpulse& impulse : model.impulses(p)) {
    if (impulse.theta <= 0.0) left[0] = impulse.share + (1.0 - impulse.share) * left[0];
  }
  return left[0];
}

}  // namespace stillzone::network
