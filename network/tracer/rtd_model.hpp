#pragma once

#include <cstddef>
#include <memory>
#include <span>
#include <string>
#include <string_view>
#include <vector>

#include "core/quantity.hpp"

namespace stillzone::network {

/// A parameter of a candidate model as the user sees it.
struct RtdParameter {
  std::string name;  ///< "mixed_fraction"
  std::string unit;  ///< "1", "m3", "m3/d"
  std::string meaning;
  double start = 0.0;
  double low = 0.0;  ///< bounds of a fit
  double high = 0.0;
};

/// A share of the tracer that leaves at one instant: a bypass (at theta 0) or the front of a plug.
struct RtdImpulse {
  double theta = 0.0;
  double share = 0.0;
  std::vector<double> share_gradient;  ///< d share / d parameter
};

/// A residence-time model with exact derivatives. Time is counted in nominal turnovers,
/// theta = integral of Q/V dt, so that a variable flow needs no further care; all flows of the
/// model scale with Q. Immutable and thread-safe.
class RtdModel {
 public:
  RtdModel() = default;
  virtual ~RtdModel() = default;
  RtdModel(const RtdModel&) = delete;
  RtdModel& operator=(const RtdModel&) = delete;

  [[nodiscard]] virtual std::string_view name() const = 0;
  [[nodiscard]] virtual std::string_view meaning() const = 0;
  [[nodiscard]] virtual std::string_view source() const = 0;
  [[nodiscard]] virtual std::span<const RtdParameter> parameters() const = 0;

  /// Of several sets of parameters that are one and the same model (two paths whose names are
  /// swapped) puts the one that the names mean in place of p.
  virtual void settle_names(std::span<double> /*p*/) const {}

  /// F(theta): share of a step that has reached the outlet, right-continuous (a bypass counts from
  /// theta = 0 on); 0 for theta < 0. gradient: dF/dp, size parameters(), may be empty.
  virtual double step_response(std::span<const double> p, double theta,
                               std::span<double> gradient) const = 0;
  /// E(theta) [1 per turnover] without the impulses. theta >= 0.
  virtual double density(std::span<const double> p, double theta,
                         std::span<double> gradient) const = 0;
  [[nodiscard]] virtual std::vector<RtdImpulse> impulses(std::span<const double> p) const = 0;
  /// Laplace transform of E at s >= 0 [1 per turnover]: what is left of a first-order decay.
  virtual double transform(std::span<const double> p, double s,
                           std::span<double> gradient) const = 0;
  [[nodiscard]] virtual double mean(std::span<const double> p) const = 0;      ///< [turnovers]
  [[nodiscard]] virtual double variance(std::span<const double> p) const = 0;  ///< [turnovers^2]
};

/// theta at which F reaches a share in (0, 1), to full precision (safeguarded; bracketing).
[[nodiscard]] double quantile(const RtdModel& model, std::span<const double> p, double share);

/// Names of the candidates: one_tank, tanks_in_series, bypass_dead, stagnant_exchange,
/// series_stagnant, plug_tank, parallel_paths, dispersion.
[[nodiscard]] std::vector<std::string> rtd_model_names();
/// A candidate for a nominal volume and flow (which turn fractions into m3 and m3/d); nullptr for
/// an unknown name.
[[nodiscard]] std::unique_ptr<const RtdModel> make_rtd_model(std::string_view name,
                                                             core::Volume nominal_volume,
                                                             core::FlowRate nominal_flow);

}  // namespace stillzone::network
