#pragma once

#include <optional>
#include <vector>

#include "network/tracer/exponential_tail.hpp"
#include "network/tracer/net_curve.hpp"

namespace stillzone::network {

/// Where a step test is heading: the level the outlet would reach.
struct StepPlateau {
  double level = 0.0;   ///< [g/m3]
  double error = 0.0;   ///< [g/m3] standard error
  bool reached = true;  ///< false: the last samples still rise and do not tell where to
  std::size_t n_samples = 0;
};

/// From the later samples: level - a exp(-rate age) by weighted least squares where it is known to
/// 5 %, else the mean of the last three samples.
[[nodiscard]] StepPlateau step_plateau(const NetCurve& curve);

/// A residence-time density as nodes of straight lines.
struct DensityNodes {
  std::vector<double> age;     ///< [d]
  std::vector<double> height;  ///< [1/d], area 1
};

/// A step test gives F = C/level. Differences of noisy samples make no density, so F is first made
/// to rise (weighted isotonic regression: the nearest curve that never falls, pooled neighbours
/// averaged), started at 0 and kept below 1 less what the exponential `tail` of level - C says is
/// still to come at the last sample; between samples it is straight. What is missing at the last
/// sample follows that exponential, or is left out without one.
[[nodiscard]] DensityNodes step_density(const NetCurve& curve, double level,
                                        const std::optional<ExponentialTail>& tail);

}  // namespace stillzone::network
