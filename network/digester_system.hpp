#pragma once

#include <cstddef>
#include <cstdint>
#include <optional>
#include <span>
#include <string>
#include <vector>

#include "core/dae/dae_system.hpp"
#include "kinetics/zone_kinetics.hpp"
#include "network/gas_meter.hpp"
#include "network/gas_pipe.hpp"
#include "network/ledger.hpp"
#include "network/model_closure.hpp"
#include "network/operation.hpp"
#include "network/state_layout.hpp"
#include "network/transport.hpp"

namespace stillzone::network {

/// A headspace's pressure and what its pipe lets out.
struct HeadspaceGas {
  double pressure = 0.0;     ///< [bar] total, water vapour included
  double flow = 0.0;         ///< [m3/d] wet, at headspace conditions
  double by_pressure = 0.0;  ///< [m3/d/bar]
};

/// A digester of zones as one sparse index-1 DAE (layout: network/state_layout.hpp):
///   zone:       dc/dt = transport + source(c, pH, g);   0 = implicit(c, pH)
///   headspace:  V_gas dg/dt = sum_z V_z transfer_z - g q(P),  P = sum p_i + vapour pressure,
///               p_i = g_i * kmol_per_unit * R * T
/// with zones and headspaces of constant volume. Quadratures: the entries of network/ledger.hpp,
/// then those of network/gas_meter.hpp for each headspace.
class DigesterSystem final : public core::DaeSystem {
 public:
  struct Options {
    Operation::Mode mode = Operation::Mode::scheduled;
    double pipe_opening_width = kPipeOpeningWidth;  ///< [bar] > 0
  };
  /// The case and the balance must outlive this object.
  DigesterSystem(const Case& the_case, const FlowBalance& balance, const Options& options);

  [[nodiscard]] std::size_t n_unknowns() const override { return layout_.n_unknowns(); }
  /// The ledger's entries, then the gas meter of each headspace.
  [[nodiscard]] std::size_t n_quadratures() const override {
    return Ledger::n_entries() + GasMeter::kReadings * layout_.n_headspaces();
  }
  [[nodiscard]] std::span<const std::uint8_t> differential() const override {
    return differential_;
  }
  [[nodiscard]] std::span<const double> floors() const override { return floors_; }
  [[nodiscard]] const core::SparsePattern& pattern() const override { return pattern_; }
  void rates(std::span<const double> y, std::span<double> f) override;
  void jacobian(std::span<const double> y, std::span<double> values) override;
  void quadrature_rates(std::span<const double> y, std::span<double> g) override;
  void quadrature_rates_along(std::span<const double> y, std::span<const double> v,
                              std::span<double> gv) override;
  [[nodiscard]] std::optional<double> next_switch(double t) const override {
    return operation_.next_switch(t);
  }
  void enter(double t) override;
  /// Sets what flows and what the feeds carry, whatever the schedules say (until the next enter):
  /// for a digester under another load.
  void operate(const OperatingPoint& point);
  [[nodiscard]] std::size_t interval_kind() const override { return kind_; }
  core::Result<core::Done> make_consistent(std::span<double> y) override;
  [[nodiscard]] std::string unknown_place(std::size_t i) const override;
  [[nodiscard]] std::string unknown_quantity(std::size_t i) const override;

  [[nodiscard]] const StateLayout& layout() const { return layout_; }
  [[nodiscard]] Operation& operation() { return operation_; }
  [[nodiscard]] const Operation& operation() const { return operation_; }
  [[nodiscard]] const Ledger& ledger() const { return ledger_; }
  [[nodiscard]] const ModelClosure& closure() const { return closure_; }
  [[nodiscard]] kinetics::ZoneKinetics& kinetics() { return kinetics_; }
  [[nodiscard]] HeadspaceGas headspace_gas(std::span<const double> y, std::size_t headspace) const;

 private:
  void gather_gases(std::span<const double> y, std::span<double> gases) const;
  void build_pattern();
  void locate_kinetics();
  void add_pipe_jacobian(std::span<const double> y, std::span<double> values) const;
  void pipe_flows(std::span<const double> y);
  static std::span<double> meter_readings(std::span<double> g, std::size_t headspace);

  const Case& case_;
  StateLayout layout_;
  double width_;
  Operation operation_;
  kinetics::ZoneKinetics kinetics_;
  Transport transport_;
  Ledger ledger_;
  ModelClosure closure_;
  std::size_t kind_ = 0;

  std::vector<std::uint8_t> differential_;
  std::vector<double> floors_;
  core::SparsePattern pattern_;
  std::vector<double> bar_per_unit_;  ///< n_headspaces * n_gases: partial pressure of one unit
  std::vector<double> vapour_;        ///< [bar] one per headspace
  std::vector<GasMeter> meters_;      ///< one per headspace

  /// Where entries of the kinetic Jacobian go: values[position] += weight * kinetic[entry].
  struct Destination {
    std::size_t entry = 0;
    std::size_t position = 0;
  };
  struct WeightedDestination {
    std::size_t entry = 0;
    std::size_t position = 0;
    double weight = 0.0;  ///< V_z / V_gas
  };
  std::vector<Destination> in_zones_;
  std::vector<WeightedDestination> in_headspaces_;
  std::vector<std::size_t> pipe_positions_;  ///< n_headspaces * n_gases * n_gases
  std::vector<double> transport_jacobian_;   ///< of the present interval, one per entry

  // scratch
  std::vector<double> gases_, transfer_, kinetic_jacobian_;
  std::vector<double> flows_, flows_along_, source_, gas_v_;
  std::vector<double> made_at_;  ///< y at which kinetic_jacobian_ was worked out for `made`
};

}  // namespace stillzone::network
