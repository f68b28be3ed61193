#pragma once

#include <cstddef>
#include <memory>
#include <span>
#include <string>
#include <string_view>
#include <vector>

#include "network/tracer/dose_response.hpp"
#include "network/tracer/rtd_model.hpp"
#include "network/tracer/tracer_test.hpp"

namespace stillzone::network {

/// Where and when a sample is taken.
struct SamplePosition {
  std::size_t point = 0;  ///< index into TracerTest::points
  double theta = 0.0;     ///< [turnovers] since the dose
};

/// A zone model as a tracer test sees it: concentrations at the sampling points from its
/// parameters, with exact derivatives. Immutable and thread-safe.
class TracerModel {
 public:
  TracerModel() = default;
  virtual ~TracerModel() = default;
  TracerModel(const TracerModel&) = delete;
  TracerModel& operator=(const TracerModel&) = delete;

  [[nodiscard]] virtual std::string name() const = 0;
  [[nodiscard]] virtual std::string meaning() const = 0;
  [[nodiscard]] virtual std::string source() const = 0;
  [[nodiscard]] virtual std::span<const RtdParameter> parameters() const = 0;

  /// False for sampling points that the model does not have: their samples are no part of its fit.
  [[nodiscard]] virtual bool sees(const SamplingPoint& point) const = 0;

  /// Net concentrations [g/m3] when all of the dose is recovered.
  /// @param gradient row after row, positions * parameters, or empty
  /// @return false when there is no such network (a flow would be negative)
  [[nodiscard]] virtual bool predict(std::span<const double> p,
                                     std::span<const SamplePosition> positions,
                                     std::span<double> values,
                                     std::span<double> gradient) const = 0;

  /// Its residence times between feed and outlet, for conversion, quantiles and curves.
  [[nodiscard]] virtual const RtdModel& residence() const = 0;
};

/// A candidate by name, for the test's dose and nominal volume and flow. It sees points at the
/// "outlet" only. nullptr for an unknown name.
[[nodiscard]] std::unique_ptr<const TracerModel> make_candidate(std::string_view name,
                                                                const TracerTest& test);

}  // namespace stillzone::network
