#include "network/tracer/pulse_nodes.hpp"

#include <algorithm>
#include <cmath>

namespace stillzone::network {
namespace {

/// Samples with a number from the peak on.
std::vector<FallingPoint> after_peak(const NetCurve& curve) {
  std::vector<FallingPoint> points;
  for (std::size_t i = curve.peak() + 1; i < curve.size(); ++i) {
    if (!curve.censored(i)) points.push_back({curve.age[i], curve.height[i], curve.error[i]});
  }
  return points;
}

void start_at_dose(const NetCurve& curve, PulseNodes& nodes) {
  if (curve.age.front() <= 0.0) return;
  const double first = curve.height.front();
  const std::size_t last_looked_at = std::min<std::size_t>(3, curve.size() - 1);
  bool rises = first <= 0.0;
  for (std::size_t i = 1; i <= last_looked_at; ++i) {
    rises = rises || curve.height[i] - first > 2.0 * std::hypot(curve.error[i], curve.error[0]);
  }
  nodes.age.push_back(0.0);
  nodes.height.push_back(rises ? 0.0 : first);
}

}  // namespace

std::optional<ExponentialTail> believable_tail(const NetCurve& curve) {
  const std::vector<FallingPoint> points = after_peak(curve);
  const auto fitted = fit_exponential_tail(points);
  if (!fitted) return std::nullopt;
  const FallingPoint& last = points.back();
  const bool below = fitted->height - last.height > 3.0 * last.error;
  if (below && last.height < 0.5 * fitted->height) return std::nullopt;
  return fitted;
}

PulseNodes pulse_nodes(const NetCurve& curve, const std::optional<ExponentialTail>& tail) {
  PulseNodes nodes;
  start_at_dose(curve, nodes);
  std::size_t last_number = curve.size();
  while (curve.censored(last_number - 1)) --last_number;
  for (std::size_t i = 0; i < curve.size(); ++i) {
    nodes.age.push_back(curve.age[i]);
    const bool on_tail = tail && i >= last_number;
    nodes.height.push_back(on_tail ? std::min(tail->height_at(curve.age[i]), curve.room[i])
                                   : curve.height[i]);
  }
  return nodes;
}

void append_tail(const ExponentialTail& tail, double start_height, PulseNodes& nodes) {
  constexpr int kNodes = 320;
  constexpr double kLengths = 16.0;  // e^-16 of the tail is left out; the steps add 2e-4 to it
  const double start = nodes.age.back();
  for (int k = 1; k <= kNodes; ++k) {
    const double x = kLengths * k / kNodes;
    nodes.age.push_back(start + x / tail.rate);
    nodes.height.push_back(start_height * std::exp(-x));
  }
}

}  // namespace stillzone::network
