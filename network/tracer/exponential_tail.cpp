#include "network/tracer/exponential_tail.hpp"

#include <algorithm>
#include <cmath>

namespace stillzone::network {
namespace {

/// Normal equations of height and rate at the present estimate.
struct Normal {
  double hh = 0.0;
  double hr = 0.0;
  double rr = 0.0;
  double gh = 0.0;
  double gr = 0.0;
  double square_sum = 0.0;
};

Normal normal_equations(std::span<const FallingPoint> points, double height, double rate) {
  Normal n;
  for (const FallingPoint& p : points) {
    const double x = p.age - points.front().age;
    const double decay = std::exp(-rate * x);
    const double residual = (p.height - height * decay) / p.error;
    const double by_height = decay / p.error;
    const double by_rate = -height * x * decay / p.error;
    n.hh += by_height * by_height;
    n.hr += by_height * by_rate;
    n.rr += by_rate * by_rate;
    n.gh += by_height * residual;
    n.gr += by_rate * residual;
    n.square_sum += residual * residual;
  }
  return n;
}

/// A first rate from the weighted logarithms of the heights above zero.
double first_rate(std::span<const FallingPoint> points) {
  double w = 0.0;
  double wx = 0.0;
  double wy = 0.0;
  double wxx = 0.0;
  double wxy = 0.0;
  for (const FallingPoint& p : points) {
    if (p.height <= 0.0) continue;
    const double x = p.age - points.front().age;
    const double y = std::log(p.height);
    const double weight = (p.height / p.error) * (p.height / p.error);
    w += weight;
    wx += weight * x;
    wy += weight * y;
    wxx += weight * x * x;
    wxy += weight * x * y;
  }
  const double spread = w * wxx - wx * wx;
  const double span = points.back().age - points.front().age;
  const double rate = spread > 0.0 ? -(w * wxy - wx * wy) / spread : 0.0;
  return std::clamp(rate, 0.01 / span, 100.0 / span);
}

/// The best height for a rate.
double height_for(std::span<const FallingPoint> points, double rate) {
  const Normal n = normal_equations(points, 0.0, rate);
  return n.hh > 0.0 ? n.gh / n.hh : 0.0;
}

/// Damped Gauss-Newton on one window.
std::optional<ExponentialTail> fit_window(std::span<const FallingPoint> points) {
  constexpr int kMostSteps = 60;
  double rate = first_rate(points);
  double height = height_for(points, rate);
  double damping = 1e-3;
  Normal n = normal_equations(points, height, rate);
  for (int step = 0; step < kMostSteps && damping < 1e12; ++step) {
    const double hh = n.hh * (1.0 + damping);
    const double rr = n.rr * (1.0 + damping);
    const double determinant = hh * rr - n.hr * n.hr;
    if (!(determinant > 0.0)) return std::nullopt;
    const double by_height = (rr * n.gh - n.hr * n.gr) / determinant;
    const double by_rate = (hh * n.gr - n.hr * n.gh) / determinant;
    const Normal tried = normal_equations(points, height + by_height, rate + by_rate);
    if (!(tried.square_sum <= n.square_sum)) {
      damping *= 10.0;
      continue;
    }
    height += by_height;
    rate += by_rate;
    n = tried;
    damping *= 0.1;
    if (std::abs(by_rate) <= 1e-12 * std::abs(rate)) break;
  }
  const double determinant = n.hh * n.rr - n.hr * n.hr;
  if (!(height > 0.0) || !(rate > 0.0) || !(determinant > 0.0)) return std::nullopt;
  const double freedom = std::max(static_cast<double>(points.size()) - 2.0, 1.0);
  const double scatter = std::max(n.square_sum / freedom, 1.0);
  const double span = points.back().age - points.front().age;
  return ExponentialTail{.at = points.back().age,
                         .height = height * std::exp(-rate * span),
                         .rate = rate,
                         .rate_error = std::sqrt(scatter * n.hh / determinant),
                         .n_points = points.size()};
}

}  // namespace

double ExponentialTail::height_at(double age) const {
  return height * std::exp(-rate * (age - at));
}

std::optional<ExponentialTail> fit_exponential_tail(std::span<const FallingPoint> points) {
  constexpr std::size_t kFewest = 3;
  constexpr std::size_t kUsual = 6;
  constexpr double kWellKnown = 0.1;
  if (points.size() < kFewest) return std::nullopt;
  std::optional<ExponentialTail> best;
  for (std::size_t n = std::min(kUsual, points.size());; n = std::min(n + n / 4, points.size())) {
    best = fit_window(points.last(n));
    if (best && best->rate_error <= kWellKnown * best->rate) return best;
    if (n == points.size()) break;
  }
  if (best && best->rate <= 2.0 * best->rate_error) return std::nullopt;
  return best;
}

}  // namespace stillzone::network
