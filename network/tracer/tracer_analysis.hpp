#pragma once

#include <memory>
#include <optional>
#include <string>
#include <vector>

#include "network/tracer/model_fit.hpp"
#include "network/tracer/tracer_moments.hpp"

namespace stillzone::network {

/// A number that follows from a fitted model, with its standard error from the fit's covariance.
struct Estimate {
  double value = 0.0;
  double standard_error = 0.0;  ///< 0 where the fit gives none
};

/// First-order decay through the tank: what is left, whatever the mixing inside (Laplace transform
/// of E), and the second-order bounds at the same k (with c0 = 1).
struct ConversionRow {
  double rate = 0.0;                ///< [1/d]
  double ideal_tank = 0.0;          ///< [1] left by one mixed tank of the nominal volume
  double plug_flow = 0.0;           ///< [1] left by plug flow through the nominal volume
  double data = 0.0;                ///< [1] left by the measured curve; NaN without a usable curve
  double data_segregated = 0.0;     ///< [1] second order, by the measured curve
  double data_maximum_mixed = 0.0;  ///< [1]
  double ideal_second_order = 0.0;  ///< [1] of one mixed tank
};
/// Share of the feed that has left before an age.
struct YoungRow {
  double age = 0.0;  ///< [d]
  double ideal_tank = 0.0;
  double data = 0.0;
};

/// What a fitted model says of the tank.
struct ModelInsight {
  double mean = 0.0;                       ///< [d] of its residence times
  double variance = 0.0;                   ///< [d2]
  double t10 = 0.0;                        ///< [d]
  double t50 = 0.0;                        ///< [d]
  double t90 = 0.0;                        ///< [d]
  double bypass = 0.0;                     ///< [1] that leaves at the instant it enters
  std::vector<Estimate> left;              ///< one per ConversionRow
  std::vector<double> left_segregated;     ///< second order, one per ConversionRow
  std::vector<double> left_maximum_mixed;  ///< second order, one per ConversionRow
  std::vector<Estimate> younger;           ///< one per YoungRow
};

struct RankedModel {
  std::shared_ptr<const TracerModel> model;
  ModelFit fit;
  ModelInsight insight;
};
struct FailedModel {
  std::string name;
  std::string reason;
};

/// Moments of one sampling point, or why there are none.
struct PointResult {
  std::string at;
  std::optional<TracerMoments> moments;
  std::string reason;
};

/// Everything a tracer test says. Models best first (corrected Akaike
/// criterion), those fitted to all sampling points before those fitted to the outlet alone.
struct TracerAnalysis {
  std::vector<PointResult> points;  ///< one per sampling point
  std::size_t outlet = 0;           ///< the first point at the outlet
  std::vector<ConversionRow> conversion;
  std::vector<YoungRow> young;
  std::vector<RankedModel> models;
  std::vector<FailedModel> failed;
  std::vector<std::string> cannot_tell;  ///< what this test leaves open, in plain words
};

struct AnalysisOptions {
  IntegrationRule rule = IntegrationRule::straight_lines;
  int threads = 0;
};

/// @param networks user networks beside the test's own candidates
[[nodiscard]] TracerAnalysis analyse_tracer_test(
    const TracerTest& test, std::vector<std::shared_ptr<const TracerModel>> networks,
    const AnalysisOptions& options);

}  // namespace stillzone::network
