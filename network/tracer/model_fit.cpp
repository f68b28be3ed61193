#include "network/tracer/model_fit.hpp"

#include <fmt/format.h>

#include <algorithm>
#include <array>
#include <cmath>
#include <limits>
#include <utility>

#include "core/least_squares.hpp"
#include "network/tracer/fit_words.hpp"
#include "network/tracer/sample_residuals.hpp"

namespace stillzone::network {
namespace {

constexpr double kRobustScale = 2.0;
/// Relative change of the sum of squares at which a fit is finished: standard errors then hold to
/// better than 1e-5.
constexpr double kTolerance = 1e-13;
constexpr std::size_t kMoreStarts = 4;
constexpr int kMostReweightings = 20;

/// A deviation in proportion to the value needs a smallest value to stay above zero: the detection
/// limit, and a hundredth of the highest sample (common practice, no source).
constexpr double kSmallestShareOfPeak = 0.01;

/// How the stated error of a sampling point turns into a deviation at a concentration.
class DeviationLaw {
 public:
  explicit DeviationLaw(const SamplingPoint& point) : point_(&point) {
    double peak = 0.0;
    for (const TracerSample& sample : point.samples) peak = std::max(peak, sample.value);
    smallest_ = std::max(point.detection_limit, kSmallestShareOfPeak * peak);
  }
  /// @param total [g/m3] background included
  [[nodiscard]] double at(double total, int n_averaged) const {
    const double value = std::max(std::abs(total), smallest_);
    return std::hypot(point_->error_absolute, point_->error_relative * value) /
           std::sqrt(static_cast<double>(n_averaged));
  }

 private:
  const SamplingPoint* point_;
  double smallest_ = 0.0;
};

std::vector<WeighedSample> weighed_samples(const TracerTest& test, const TracerModel& model,
                                           std::span<const DeviationLaw> laws) {
  std::vector<WeighedSample> samples;
  for (std::size_t k = 0; k < test.points.size(); ++k) {
    if (!model.sees(test.points[k])) continue;
    for (std::size_t i = 0; i < test.points[k].samples.size(); ++i) {
      const TracerSample& sample = test.points[k].samples[i];
      const double background =
          test.background.level + test.background.slope * (sample.time - test.dose_at);
      samples.push_back({.position = {.point = k, .theta = test.turnovers(sample.time)},
                         .net = sample.value - background,
                         .background = background,
                         .deviation = laws[k].at(sample.value, sample.n_averaged),
                         .weight = 1.0,
                         .censored = sample.censored,
                         .source = i});
    }
  }
  return samples;
}

std::vector<core::FitParameter> fit_parameters(const TracerTest& test, const TracerModel& model) {
  std::vector<core::FitParameter> parameters;
  for (const RtdParameter& p : model.parameters()) {
    parameters.push_back({.name = p.name, .start = p.start, .low = p.low, .high = p.high});
  }
  if (test.recovery_fitted) {
    parameters.push_back({.name = "recovered_fraction", .start = 1.0, .low = 0.02, .high = 5.0});
  }
  return parameters;
}

/// Van der Corput's sequence in a prime base: points that fill (0, 1) evenly.
double spread_point(std::size_t number, unsigned base) {
  double value = 0.0;
  double step = 1.0;
  for (std::size_t k = number; k > 0; k /= base) {
    step /= base;
    value += step * static_cast<double>(k % base);
  }
  return value;
}

std::vector<std::vector<double>> more_starts(std::span<const core::FitParameter> parameters) {
  constexpr std::array<unsigned, 8> kBases = {2, 3, 5, 7, 11, 13, 17, 19};
  std::vector<std::vector<double>> starts;
  for (std::size_t k = 1; k <= kMoreStarts; ++k) {
    std::vector<double> start;
    for (std::size_t j = 0; j < parameters.size(); ++j) {
      const core::FitParameter& p = parameters[j];
      const double x = spread_point(k, kBases[j % kBases.size()]);
      if (p.low > 0.0 && p.high > 50.0 * p.low) {  // a scale: up to 5 times either way
        start.push_back(std::clamp(p.start * std::pow(5.0, 2.0 * x - 1.0), p.low, p.high));
      } else {
        start.push_back(p.low +
                        (0.05 + 0.9 * x) * (std::min(p.high, 1.2 * p.start + p.low + 1.0) - p.low));
        start.back() = std::clamp(start.back(), p.low, p.high);
      }
    }
    starts.push_back(std::move(start));
  }
  return starts;
}

/// Sets deviations (and a robust loss's weights) by the fit. @return largest relative change
double reweigh(const core::LeastSquaresFit& fit, std::span<const DeviationLaw> laws,
               const TracerTest& test, SampleResiduals& residuals) {
  std::vector<double> fitted(residuals.n_residuals());
  if (!residuals.predict(fit.parameters, fitted)) return 0.0;
  double change = 0.0;
  for (std::size_t i = 0; i < fitted.size(); ++i) {
    WeighedSample& sample = residuals.samples()[i];
    const SamplingPoint& point = test.points[sample.position.point];
    const double before = sample.deviation / std::sqrt(sample.weight);
    if (point.error_relative > 0.0) {
      sample.deviation = laws[sample.position.point].at(fitted[i] + sample.background,
                                                        point.samples[sample.source].n_averaged);
    }
    if (test.robust && !sample.censored) {
      const double r = (fitted[i] - sample.net) / sample.deviation / kRobustScale;
      sample.weight = 1.0 / std::sqrt(1.0 + r * r);
    }
    const double now = sample.deviation / std::sqrt(sample.weight);
    change = std::max(change, std::abs(now / before - 1.0));
  }
  return change;
}

/// The same solution under the names that the model's parameters mean, fitted from there.
core::Result<core::LeastSquaresFit> named_as_meant(const TracerModel& model,
                                                   core::LeastSquaresFit fit,
                                                   std::span<core::FitParameter> parameters,
                                                   const SampleResiduals& residuals) {
  std::vector<double> settled = fit.parameters;
  model.residence().settle_names(std::span(settled).first(model.parameters().size()));
  if (settled == fit.parameters) return fit;
  for (std::size_t j = 0; j < parameters.size(); ++j) parameters[j].start = settled[j];
  core::LeastSquaresOptions options;
  options.accept_plateau = true;
  options.tolerance = kTolerance;
  auto again = fit_least_squares(residuals, parameters, options);
  if (!again) return again;
  again.value().starts_tried = fit.starts_tried;
  again.value().starts_agreeing = fit.starts_agreeing;
  return again;
}

/// Fits, then fits again from there until the deviations agree with the fitted values.
core::Result<core::LeastSquaresFit> fit_reweighted(const TracerTest& test, const TracerModel& model,
                                                   std::span<const DeviationLaw> laws,
                                                   std::span<core::FitParameter> parameters,
                                                   SampleResiduals& residuals) {
  core::LeastSquaresOptions options;
  options.accept_plateau = true;
  options.tolerance = kTolerance;
  options.more_starts = more_starts(parameters);
  if (test.robust) options.loss = core::LeastSquaresOptions::Loss::soft_l1;
  options.loss_scale = kRobustScale;
  auto fit = fit_least_squares(residuals, parameters, options);
  if (fit) fit = named_as_meant(model, std::move(fit.value()), parameters, residuals);
  const bool relative = std::any_of(test.points.begin(), test.points.end(),
                                    [](const auto& point) { return point.error_relative > 0.0; });
  if (!fit || (!relative && !test.robust)) return fit;
  const core::LeastSquaresFit first = fit.value();
  options.more_starts.clear();
  options.loss = core::LeastSquaresOptions::Loss::squares;
  for (int k = 0; k < kMostReweightings; ++k) {
    const double change = reweigh(fit.value(), laws, test, residuals);
    if (k > 0 && change < 1e-4) break;
    for (std::size_t j = 0; j < parameters.size(); ++j) {
      parameters[j].start = fit.value().parameters[j];
    }
    options.timid_steps_too = false;
    auto next = fit_least_squares(residuals, parameters, options);
    if (!next) return next;
    fit = std::move(next);
  }
  fit.value().ambiguous = first.ambiguous;
  fit.value().starts_tried = first.starts_tried;
  fit.value().starts_agreeing = first.starts_agreeing;
  return fit;
}

/// -2 ln likelihood of the quantified samples with unknown common scale, that of the censored ones,
/// and the correction for small samples.
double criterion_of(const SampleResiduals& residuals, const core::LeastSquaresFit& fit) {
  double squares = 0.0;
  double rest = 0.0;
  for (std::size_t i = 0; i < residuals.n_residuals(); ++i) {
    const WeighedSample& sample = residuals.samples()[i];
    const double square = fit.residuals[i] * fit.residuals[i];
    if (sample.censored) {
      rest += square;
      continue;
    }
    squares += square;
    rest += std::log(sample.deviation * sample.deviation / sample.weight);
  }
  return core::corrected_akaike(squares, residuals.n_observations(), fit.parameters.size()) + rest;
}

void fill_samples(const TracerTest& test, const SampleResiduals& residuals,
                  const core::LeastSquaresFit& fit, ModelFit& result) {
  std::vector<double> fitted(residuals.n_residuals());
  SZ_REQUIRE(residuals.predict(fit.parameters, fitted), "the fit cannot be evaluated again");
  double squares = 0.0;
  std::vector<double> quantified;
  for (std::size_t i = 0; i < fitted.size(); ++i) {
    const WeighedSample& sample = residuals.samples()[i];
    const TracerSample& source = test.points[sample.position.point].samples[sample.source];
    result.samples.push_back({.point = sample.position.point,
                              .time = source.time,
                              .theta = sample.position.theta,
                              .measured = sample.net,
                              .fitted = fitted[i],
                              .deviation = sample.deviation,
                              .censored = sample.censored,
                              .residual = fit.residuals[i],
                              .weight = sample.weight});
    if (sample.censored) continue;
    squares += (fitted[i] - sample.net) * (fitted[i] - sample.net);
    quantified.push_back(fit.residuals[i]);
  }
  result.rmse = std::sqrt(squares / static_cast<double>(residuals.n_observations()));
  result.tests = residual_tests(quantified, result.degrees_of_freedom);
  if (!result.tests.outlier) return;
  std::size_t at = *result.tests.outlier;  // among the quantified
  for (std::size_t i = 0; i < result.samples.size(); ++i) {
    if (result.samples[i].censored) continue;
    if (at-- > 0) continue;
    result.tests.outlier = i;
    const FittedSample& far = result.samples[i];
    result.tests.words.push_back(fmt::format(
        "The sample at {:.4g} d ({:.3g} g/m3 net, fitted {:.3g}) lies {:.1f} stated errors off: "
        "check it in the laboratory's book, or fit with \"loss\": \"robust\".",
        far.time, far.measured, far.fitted, std::abs(far.residual)));
    return;
  }
}

std::vector<FittedParameter> described(const TracerModel& model,
                                       std::span<const core::FitParameter> parameters,
                                       const core::LeastSquaresFit& fit,
                                       const core::FitUncertainty& uncertainty) {
  std::vector<FittedParameter> result;
  const std::size_t n_model = model.parameters().size();
  for (std::size_t j = 0; j < parameters.size(); ++j) {
    FittedParameter p;
    p.name = parameters[j].name;
    p.unit = j < n_model ? model.parameters()[j].unit : "1";
    p.meaning = j < n_model ? model.parameters()[j].meaning : "share of the dose that was seen";
    p.value = fit.parameters[j];
    p.standard_error =
        fit.at_bound[j] ? std::numeric_limits<double>::quiet_NaN() : uncertainty.standard_error[j];
    if (fit.without_effect[j]) p.standard_error = std::numeric_limits<double>::infinity();
    p.bound_low = parameters[j].low;
    p.bound_high = parameters[j].high;
    p.at_bound = fit.at_bound[j];
    result.push_back(std::move(p));
  }
  return result;
}

}  // namespace

std::vector<double> ModelFit::model_values() const {
  std::vector<double> values;
  for (const FittedParameter& p : parameters) {
    if (p.name != "recovered_fraction") values.push_back(p.value);
  }
  return values;
}

double ModelFit::recovered_fraction() const {
  return !parameters.empty() && parameters.back().name == "recovered_fraction"
             ? parameters.back().value
             : 1.0;
}

core::Result<ModelFit> fit_model(const TracerTest& test, const TracerModel& model,
                                 const ModelFitOptions& options) {
  std::vector<DeviationLaw> laws;
  for (const SamplingPoint& point : test.points) laws.emplace_back(point);
  SampleResiduals residuals(model, weighed_samples(test, model, laws), test.recovery_fitted);
  std::vector<core::FitParameter> parameters = fit_parameters(test, model);
  const std::size_t needed = parameters.size() + 2;
  if (residuals.n_observations() < needed) {
    return core::Failure{
        .reason = fmt::format("{} quantified samples for {} parameters; at least {} are needed",
                              residuals.n_observations(), parameters.size(), needed),
        .try_this = "Leave this model out, or take \"recovery\": \"as dosed\"."};
  }
  auto fitted = fit_reweighted(test, model, laws, parameters, residuals);
  if (!fitted) return fitted.failure();
  const core::LeastSquaresFit& fit = fitted.value();
  const core::FitUncertainty uncertainty = core::fit_uncertainty(fit, parameters.size());

  ModelFit result;
  result.name = model.name();
  result.meaning = model.meaning();
  result.source = model.source();
  result.parameters = described(model, parameters, fit, uncertainty);
  result.covariance = uncertainty.covariance;
  result.correlation = uncertainty.correlation;
  result.sum_of_squares = fit.sum_of_squares;
  result.residual_deviation = uncertainty.residual_deviation;
  result.degrees_of_freedom = uncertainty.degrees_of_freedom;
  result.starts_tried = fit.starts_tried;
  result.starts_agreeing = fit.starts_agreeing;
  result.aicc = criterion_of(residuals, fit);
  fill_samples(test, residuals, fit, result);
  result.all_points = std::ranges::all_of(
      test.points, [&](const SamplingPoint& point) { return model.sees(point); });
  if (options.intervals) {
    for (std::size_t j = 0; j < parameters.size(); ++j) {
      const core::ProfileInterval interval =
          core::profile_interval(residuals, parameters, fit, j, options.confidence,
                                 {.most_iterations = 100, .tolerance = 1e-9, .more_starts = {}});
      result.parameters[j].low = interval.low;
      result.parameters[j].high = interval.high;
      if (interval.better_minimum_found) {
        result.remarks.push_back(
            fmt::format("While the interval of {} was sought a better fit appeared: the one shown "
                        "is a local one.",
                        parameters[j].name));
      }
      judge_parameter(result.parameters[j]);
    }
  }
  add_remarks(uncertainty.singular, fit.ambiguous, result);
  return result;
}

}  // namespace stillzone::network
