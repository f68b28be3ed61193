#pragma once

#include <optional>
#include <string>
#include <vector>

#include "core/result.hpp"
#include "network/tracer/residual_tests.hpp"
#include "network/tracer/tracer_model.hpp"

namespace stillzone::network {

/// A parameter of a fitted model, as far as the test tells it.
struct FittedParameter {
  std::string name;
  std::string unit;
  std::string meaning;
  double value = 0.0;
  double standard_error = 0.0;  ///< infinite where the test does not determine the parameter
  /// Ends of the 95 % profile-likelihood interval; empty where it runs to the bound of the search.
  std::optional<double> low;
  std::optional<double> high;
  double bound_low = 0.0;  ///< of the search
  double bound_high = 0.0;
  bool at_bound = false;
  /// Both ends lie inside the bounds and no further apart than twice the value.
  bool identified = false;
  std::string verdict;  ///< in plain words
};

/// One sample beside the fit.
struct FittedSample {
  std::size_t point = 0;   ///< index into TracerTest::points
  double time = 0.0;       ///< [d]
  double theta = 0.0;      ///< [turnovers] since the dose
  double measured = 0.0;   ///< [g/m3] background taken off; the limit, likewise, when censored
  double fitted = 0.0;     ///< [g/m3] without background
  double deviation = 0.0;  ///< [g/m3] standard deviation in the fit
  bool censored = false;
  double residual = 0.0;  ///< (fitted - measured) / deviation; censored: +-sqrt(-2 ln likelihood)
  double weight = 1.0;    ///< below 1 where a robust loss trusts the sample less
};

/// A zone model fitted to all samples of a test by weighted least squares.
struct ModelFit {
  std::string name;
  std::string meaning;
  std::string source;
  std::vector<FittedParameter> parameters;  ///< the model's, then recovered_fraction if fitted
  std::vector<double> covariance;           ///< parameters squared; 0 for those at a bound
  std::vector<double> correlation;
  double aicc = 0.0;                ///< corrected Akaike criterion of the samples in g/m3
  double weight = 0.0;              ///< Akaike weight among the models compared
  double rmse = 0.0;                ///< [g/m3] of the quantified samples
  double sum_of_squares = 0.0;      ///< weighted
  double residual_deviation = 0.0;  ///< [1] scatter about the fit in units of the stated error
  long degrees_of_freedom = 0;
  std::vector<FittedSample> samples;
  /// False when the model has no place for some sampling points: fitted to the outlet alone, its
  /// criterion does not compare with those of models fitted to all samples.
  bool all_points = true;
  ResidualTests tests;
  std::size_t starts_tried = 0;
  std::size_t starts_agreeing = 0;
  std::vector<std::string> remarks;  ///< on what this test cannot tell, in plain words

  /// The values of the model's own parameters, recovered_fraction left out.
  [[nodiscard]] std::vector<double> model_values() const;
  /// 1 when recovery was not fitted.
  [[nodiscard]] double recovered_fraction() const;
};

struct ModelFitOptions {
  double confidence = 0.95;
  bool intervals = true;  ///< profile intervals; without them identified and verdict stay empty
};

/// Fits one model to the test's samples.
///   residual = (recovered * model + background - value) / deviation
/// and for a sample known only to lie below L: sqrt(-2 ln Phi((L - c)/deviation)), so that its
/// square adds the right likelihood. Deviations in proportion to the value go by the fitted value
/// (iteratively reweighted), so that low readings do not pull the fit; a robust loss (soft L1,
/// scale 2) ends in weights held fixed, so that covariance and intervals are those of a weighted
/// fit. Bounds, several starts; covariance s^2 (J'J)^-1, intervals by profile likelihood
/// (Bates and Watts 1988), criterion of Hurvich and Tsai (1989).
/// Failure: fewer samples than parameters + 2, or no start converged.
[[nodiscard]] core::Result<ModelFit> fit_model(const TracerTest& test, const TracerModel& model,
                                               const ModelFitOptions& options);

}  // namespace stillzone::network
