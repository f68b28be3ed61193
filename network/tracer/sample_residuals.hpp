#pragma once

#include <cstddef>
#include <span>
#include <vector>

#include "core/least_squares.hpp"
#include "network/tracer/tracer_model.hpp"

namespace stillzone::network {

/// One sample as the fit sees it.
struct WeighedSample {
  SamplePosition position;
  double net = 0.0;         ///< [g/m3] value (or limit) less the background
  double background = 0.0;  ///< [g/m3] under it
  double deviation = 0.0;   ///< [g/m3] > 0
  double weight = 1.0;      ///< of a robust loss; the deviation in use is deviation / sqrt(weight)
  bool censored = false;
  std::size_t source = 0;  ///< number of the sample within its point
};

/// Residual of a sample known to lie below a limit: sqrt(-2 ln Phi(z)), z = (limit - c)/deviation.
struct CensoredResidual {
  double value = 0.0;
  double slope = 0.0;  ///< d value / d (-z), i.e. with respect to c / deviation
};
[[nodiscard]] CensoredResidual censored_residual(double z);

/// Weighted residuals of a test against a model. Parameters: the model's, then recovered_fraction
/// when it is fitted.
class SampleResiduals final : public core::ResidualFunction {
 public:
  /// The model must outlive this object.
  SampleResiduals(const TracerModel& model, std::vector<WeighedSample> samples,
                  bool recovery_fitted);

  [[nodiscard]] std::size_t n_residuals() const override { return samples_.size(); }
  [[nodiscard]] std::size_t n_parameters() const override { return n_parameters_; }
  [[nodiscard]] std::size_t n_observations() const override { return n_quantified_; }
  [[nodiscard]] bool evaluate(std::span<const double> parameters, std::span<double> residuals,
                              std::span<double> jacobian) const override;

  [[nodiscard]] std::span<WeighedSample> samples() { return samples_; }
  [[nodiscard]] std::span<const WeighedSample> samples() const { return samples_; }
  /// Net concentrations [g/m3], recovery included. @return false when there is no such network
  [[nodiscard]] bool predict(std::span<const double> parameters, std::span<double> values) const;

 private:
  const TracerModel& model_;
  std::vector<WeighedSample> samples_;
  std::vector<SamplePosition> positions_;
  bool recovery_fitted_;
  std::size_t n_parameters_;
  std::size_t n_quantified_ = 0;
};

}  // namespace stillzone::network
