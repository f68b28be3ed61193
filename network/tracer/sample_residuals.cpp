#include "network/tracer/sample_residuals.hpp"

#include <cmath>
#include <numbers>
#include <utility>

namespace stillzone::network {
namespace {

/// ln Phi(z) and phi(z)/Phi(z).
struct NormalTail {
  double log_probability = 0.0;
  double hazard = 0.0;
};

NormalTail normal_tail(double z) {
  const double log_density = -0.5 * z * z - 0.5 * std::log(2.0 * std::numbers::pi);
  if (z < -30.0) {
    // Phi(z) = phi(z)/(-z) (1 - 1/z^2 + 3/z^4 - ...), DLMF 7.12.1.
    const double inverse = 1.0 / (z * z);
    const double series = -inverse * (1.0 - 3.0 * inverse * (1.0 - 5.0 * inverse));
    const double log_probability = log_density - std::log(-z) + std::log1p(series);
    return {log_probability, std::exp(log_density - log_probability)};
  }
  const double above = 0.5 * std::erfc(z / std::numbers::sqrt2);
  const double log_probability =
      z > 0.0 ? std::log1p(-above) : std::log(0.5 * std::erfc(-z / std::numbers::sqrt2));
  return {log_probability, std::exp(log_density - log_probability)};
}

}  // namespace

CensoredResidual censored_residual(double z) {
  const NormalTail tail = normal_tail(z);
  const double value = std::sqrt(std::max(0.0, -2.0 * tail.log_probability));
  if (value < 1e-100) return {};
  return {value, tail.hazard / value};
}

SampleResiduals::SampleResiduals(const TracerModel& model, std::vector<WeighedSample> samples,
                                 bool recovery_fitted)
    : model_(model),
      samples_(std::move(samples)),
      recovery_fitted_(recovery_fitted),
      n_parameters_(model.parameters().size() + (recovery_fitted ? 1 : 0)) {
  for (const WeighedSample& sample : samples_) {
    positions_.push_back(sample.position);
    if (!sample.censored) ++n_quantified_;
  }
}

bool SampleResiduals::predict(std::span<const double> parameters, std::span<double> values) const {
  const std::size_t n_model = model_.parameters().size();
  if (!model_.predict(parameters.first(n_model), positions_, values, {})) return false;
  const double recovered = recovery_fitted_ ? parameters[n_model] : 1.0;
  for (double& value : values) value *= recovered;
  return true;
}

bool SampleResiduals::evaluate(std::span<const double> parameters, std::span<double> residuals,
                               std::span<double> jacobian) const {
  const std::size_t n_model = model_.parameters().size();
  const double recovered = recovery_fitted_ ? parameters[n_model] : 1.0;
  std::vector<double> values(samples_.size());
  std::vector<double> slopes(jacobian.empty() ? 0 : samples_.size() * n_model);
  if (!model_.predict(parameters.first(n_model), positions_, values, slopes)) return false;
  for (std::size_t i = 0; i < samples_.size(); ++i) {
    const WeighedSample& sample = samples_[i];
    const double deviation = sample.deviation / std::sqrt(sample.weight);
    const double excess = (recovered * values[i] - sample.net) / deviation;
    double by_value = 1.0 / deviation;
    if (sample.censored) {
      const CensoredResidual censored = censored_residual(-excess);
      residuals[i] = censored.value;
      by_value *= censored.slope;
    } else {
      residuals[i] = excess;
    }
    if (jacobian.empty()) continue;
    const std::span<double> row = jacobian.subspan(i * n_parameters_, n_parameters_);
    for (std::size_t j = 0; j < n_model; ++j) {
      row[j] = by_value * recovered * slopes[i * n_model + j];
    }
    if (recovery_fitted_) row[n_model] = by_value * values[i];
  }
  return true;
}

}  // namespace stillzone::network
