#pragma once

#include <span>

#include "core/continuation/parametric_system.hpp"
#include "network/digester_system.hpp"
#include "network/transport.hpp"
#include "network/washout/load_flows.hpp"

namespace stillzone::network {

/// A digester's steady problem with the load as its parameter, f(y, load). Rates are linear in the
/// flows, so df/dload is the transport under d(flows)/dload.
class LoadedDigester final : public core::ParametricSystem {
 public:
  /// All must outlive this object.
  LoadedDigester(const Case& the_case, const FlowBalance& balance, const LoadFlows& flows);

  [[nodiscard]] core::DaeSystem& system() override { return digester_; }
  void set_parameter(double load) override;
  void parameter_derivative(std::span<const double> y, std::span<double> df) override;

  [[nodiscard]] DigesterSystem& digester() { return digester_; }
  /// Flows and feeds at the load set last.
  [[nodiscard]] const OperatingPoint& point() const { return point_; }
  [[nodiscard]] double load() const { return load_; }

 private:
  const LoadFlows& flows_;
  DigesterSystem digester_;
  Transport change_;
  OperatingPoint point_;
  double load_ = 1.0;
};

}  // namespace stillzone::network
