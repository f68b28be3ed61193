#pragma once

#include <optional>
#include <string>
#include <vector>

#include "network/tracer/net_curve.hpp"
#include "network/tracer/tracer_moments.hpp"
#include "network/tracer/tracer_test.hpp"

namespace stillzone::network {

/// What the verdict looks at beside the moments.
struct VerdictEvidence {
  const TracerTest& test;
  const NetCurve& measured;
  double dose_length = 0.0;  ///< [d] of age
  /// Mean [d] with every sample under the limit at 0, and at its limit.
  std::optional<double> mean_low = {};
  std::optional<double> mean_high = {};
  bool plateau_reached = true;  ///< of a step test
  bool variance_was_below_zero = false;
};

/// Plain sentences on the quality of the data, gravest first; the recovery always has one. Limits
/// that are habits of the trade are said to be.
[[nodiscard]] std::vector<std::string> tracer_verdict(const TracerMoments& moments,
                                                      const VerdictEvidence& evidence);

}  // namespace stillzone::network
