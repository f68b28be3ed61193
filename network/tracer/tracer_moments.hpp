#pragma once

#include <optional>
#include <string>
#include <vector>

#include "network/tracer/tracer_test.hpp"

namespace stillzone::network {

/// How the area under the samples is taken. The rule moves the variance far more than the mean, so
/// it is always named.
enum class IntegrationRule {
  straight_lines,  ///< concentration straight between samples, moments integrated exactly (default)
  trapezoid,       ///< trapezoid on t^k C
  equal_step_sum,  ///< sum of t^k C dt, equally spaced samples only
  simpson,         ///< Simpson's rule on t^k C over stretches of equal steps
};
[[nodiscard]] std::string rule_name(IntegrationRule rule);

/// What the samples say without any model. Ages in days at the mean flow (turnovers x V/Q).
struct TracerMoments {
  IntegrationRule rule = IntegrationRule::straight_lines;
  double hydraulic_retention_time = 0.0;   ///< [d] V/Q
  double recovery = 0.0;                   ///< [1] mass at the outlet / mass dosed, tail included
  double area = 0.0;                       ///< [g d/m3] under the net curve, tail included
  double mean = 0.0;                       ///< [d]
  double variance = 0.0;                   ///< [d2]
  double tail_share = 0.0;                 ///< [1] of the area beyond the last sample
  double tail_rate = 0.0;                  ///< [1/d] of the fitted exponential; 0 when none
  std::string tail_note;                   ///< how the tail was fitted, or why not
  double active_fraction = 0.0;            ///< [1] mean / hydraulic_retention_time
  double t10 = 0.0, t50 = 0.0, t90 = 0.0;  ///< [d]
  double morrill = 0.0;                    ///< t90/t10
  double baffling = 0.0;                   ///< t10/tau
  std::vector<double> age;                 ///< [d] nodes of the curve, tail included
  std::vector<double> cumulative;          ///< F at the nodes, 0 to 1
  std::vector<double> density;             ///< E at the nodes [1/d]
  std::vector<std::string> verdict;        ///< data quality in plain sentences, worst first
};

/// Moments of one sampling point (the outlet). Failure when there are fewer than 4 usable samples
/// or no tracer was seen.
[[nodiscard]] core::Result<TracerMoments> tracer_moments(const TracerTest& test,
                                                         const SamplingPoint& point,
                                                         IntegrationRule rule);

/// First-order conversion and the bounds of micromixing straight from a curve.
/// Segregated: integral of E exp(-k t). Second order: total segregation and maximum mixedness
/// (Zwietering 1959, Chem. Eng. Sci. 11:1-15).
struct ConversionBounds {
  double segregated = 0.0;         ///< share left
  double maximum_mixedness = 0.0;  ///< share left
  double plug = 0.0;
  double mixed = 0.0;
};
[[nodiscard]] double first_order_left(const TracerMoments& curve, double rate_1_d);
[[nodiscard]] ConversionBounds second_order_left(const TracerMoments& curve, double k_c0_1_d);
/// Share of the flow younger than an age [d].
[[nodiscard]] double share_younger_than(const TracerMoments& curve, double age_d);

}  // namespace stillzone::network
