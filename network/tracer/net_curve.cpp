#include "network/tracer/net_curve.hpp"

#include <algorithm>
#include <cmath>

namespace stillzone::network {
namespace {

/// Adds a sample of the same age to the last one: numbers are averaged, a limit beside a number
/// says nothing more, of two limits the lower holds.
void merge_into_last(NetCurve& curve, double height, double error, double room) {
  const bool censored = room >= 0.0;
  if (curve.room.back() >= 0.0 && censored) {
    curve.room.back() = std::min(curve.room.back(), room);
  } else if (!censored && curve.room.back() < 0.0) {
    const double w = 1.0 / (curve.error.back() * curve.error.back());
    const double v = 1.0 / (error * error);
    curve.height.back() = (w * curve.height.back() + v * height) / (w + v);
    curve.error.back() = 1.0 / std::sqrt(w + v);
  } else if (!censored) {
    curve.height.back() = height;
    curve.error.back() = error;
    curve.room.back() = room;
  }
}

}  // namespace

std::size_t NetCurve::peak() const {
  std::size_t best = size();
  for (std::size_t i = 0; i < size(); ++i) {
    if (!censored(i) && (best == size() || height[i] > height[best])) best = i;
  }
  return best;
}

NetCurve net_curve(const TracerTest& test, const SamplingPoint& point,
                   const CensoredAt& censored_at) {
  const double tau = test.volume.value() / test.mean_flow.value();
  NetCurve curve;
  for (const TracerSample& sample : point.samples) {
    const double age = test.turnovers(sample.time) * tau;
    if (age < 0.0) continue;
    const double background =
        test.background.level + test.background.slope * (sample.time - test.dose_at);
    const double height = sample.value - background;
    const double room = sample.censored ? std::max(height, 0.0) : -1.0;
    if (!curve.age.empty() && age <= curve.age.back() + 1e-9 * tau) {
      merge_into_last(curve, height, sample.error, room);
      continue;
    }
    curve.age.push_back(age);
    curve.height.push_back(height);
    curve.error.push_back(sample.error);
    curve.room.push_back(room);
  }
  bool seen = false;
  for (std::size_t i = 0; i < curve.size(); ++i) {
    seen = seen || !curve.censored(i);
    if (curve.censored(i)) curve.height[i] = seen ? censored_at.share * curve.room[i] : 0.0;
  }
  return curve;
}

}  // namespace stillzone::network
