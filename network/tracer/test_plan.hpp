#pragma once

#include <optional>
#include <string>
#include <vector>

#include "core/result.hpp"
#include "network/tracer/tracer_model.hpp"

namespace stillzone::network {

/// What a test is meant to find, at the size suspected.
struct SuspectedFaults {
  double dead_fraction = 0.2;             ///< [1] of the nominal volume
  double bypass_fraction = 0.05;          ///< [1] of the feed
  double stagnant_fraction = 0.25;        ///< [1] of the nominal volume
  std::optional<double> exchange_flow{};  ///< [m3/d] with the stagnant zone; else 0.3 of the flow
};

/// A test that is still to be made.
struct PlanRequest {
  TracerTest test;             ///< one point "outlet" without samples; its errors are the lab's
  std::optional<double> peak;  ///< [g/m3] wanted
  std::size_t n_samples = 25;
  double duration = 60.0;      ///< [d]
  double earliest = 0.04;      ///< [d] of the first sample
  double shortest_gap = 0.04;  ///< [d] between samples
  SuspectedFaults suspect;
  int draws = 60;  ///< simulated tests per magnitude
  unsigned seed = 1;
  int threads = 0;
};

/// A candidate at its suspected values, and how well the plan would hold its parameters.
struct PlannedModel {
  std::string name;
  std::vector<RtdParameter> parameters;  ///< recovered_fraction last when it is fitted
  std::vector<double> values;
  std::vector<double> standard_errors;  ///< infinite where the plan does not determine them
  bool in_design = true;                ///< false: no schedule could determine its parameters
  double efficiency_equal = 0.0;        ///< [1] of equally spaced samples beside the plan's
  double efficiency_geometric = 0.0;    ///< [1] of geometrically spaced ones
  std::vector<double> curve;            ///< [g/m3] net, at TestPlan::grid
};

/// How often a fault of some size would be seen.
struct DetectionCurve {
  std::string fault;               ///< "dead volume", "bypass", "stagnant zone"
  std::string how;                 ///< what counts as seen
  std::vector<double> magnitudes;  ///< [1], rising; the first is 0: false alarms
  std::vector<double> power;       ///< [1] share of simulated tests
  std::optional<double> smallest;  ///< [1] first magnitude seen in 80 % of tests
};

struct TestPlan {
  double mass = 0.0;          ///< [g]
  std::string mass_how;       ///< where it comes from
  double peak = 0.0;          ///< [g/m3] in a mixed tank
  std::vector<double> times;  ///< [d] after the dose, rising
  std::vector<double> grid;   ///< [d] for curves
  std::vector<PlannedModel> models;
  std::vector<DetectionCurve> detection;
  std::vector<std::string> remarks;
};

/// Dose, sampling times and what they would show. Times maximise the sum over the candidates of
/// (1/p) ln det(J'WJ) (D-optimality for several models; Atkinson and Donev 1992, Optimum
/// Experimental Designs) over a grid of times, by building up and exchanging points (Fedorov 1972,
/// Theory of Optimal Experiments); samples under the detection limit count nothing. One sample in
/// five is spread geometrically over the whole test beforehand, so that what no candidate foresaw
/// would show (common practice, no source). Detection by
/// simulated tests with the stated errors; draws depend on the seed alone.
[[nodiscard]] TestPlan plan_test(const PlanRequest& request);

/// Times out of `candidates` [d] that maximise the design criterion for models of known gradients.
/// @param weighted per model, candidates.size() * p entries: gradient / standard deviation
/// @param n_parameters per model
/// @param kept candidates that stand in any case, not moved
[[nodiscard]] std::vector<std::size_t> optimal_design(
    const std::vector<std::vector<double>>& weighted, const std::vector<std::size_t>& n_parameters,
    const std::vector<double>& candidates, std::vector<std::size_t> kept, std::size_t n_samples,
    double shortest_gap);

}  // namespace stillzone::network
