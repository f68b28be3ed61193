#pragma once

#include <cstddef>
#include <memory>
#include <span>
#include <vector>

#include "core/result.hpp"
#include "kinetics/kinetic_model.hpp"

namespace stillzone::kinetics {

/// What is fixed in a zone during an integration.
struct ZoneConditions {
  double temperature = 308.15;      ///< [K]
  double gas_transfer = 0.0;        ///< kLa [1/d], >= 0; 0: no exchange with a headspace
  double gas_temperature = 308.15;  ///< [K] of the headspace it exchanges with
};

/// Where the zone's Jacobian may be non-zero. Rows: components, implicit equations, then the
/// gas transfers. Columns: components, implicit unknowns, then the gases of its headspace.
struct KineticEntry {
  std::size_t row = 0;
  std::size_t column = 0;
};

/// The biochemistry of many zones at once. The waist between kinetics and network: sizes, rates,
/// exact Jacobian on a known pattern. One object per thread (it owns scratch).
///
/// Arrays are zone after zone: unknowns[z * n_zone_unknowns + i], gases[z * n_gases + g] (the gases
/// of the headspace that zone z exchanges with; any finite value where it has none).
class ZoneKinetics {
 public:
  ZoneKinetics(const KineticModel& model, std::vector<ZoneConditions> zones);
  ~ZoneKinetics();
  ZoneKinetics(const ZoneKinetics&) = delete;
  ZoneKinetics& operator=(const ZoneKinetics&) = delete;

  [[nodiscard]] const KineticModel& model() const;
  [[nodiscard]] std::size_t n_zones() const;
  /// New conditions for the same zones (a change of temperature or kLa between intervals).
  void set_conditions(std::span<const ZoneConditions> zones);

  /// @param source [unit/m3/d] n_zones * n_zone_unknowns: net production of each component, gas
  ///   transfer taken off; then the residual of each implicit equation (0 = solved).
  /// @param transfer [gas unit per m3 of liquid per d] n_zones * n_gases: from liquid into gas.
  void rates(std::span<const double> unknowns, std::span<const double> gases,
             std::span<double> source, std::span<double> transfer);

  [[nodiscard]] std::span<const KineticEntry> pattern() const;
  /// @param values n_zones * pattern().size(): derivatives of source and transfer, zone after zone.
  void jacobian(std::span<const double> unknowns, std::span<const double> gases,
                std::span<double> values);

  /// Process rates [unit/m3/d] of each zone, n_zones * n_processes, for reports and audits.
  void process_rates(std::span<const double> unknowns, std::span<const double> gases,
                     std::span<double> rates);
  [[nodiscard]] std::size_t n_processes() const;

  /// n_zones * model().derived.size()
  void derived(std::span<const double> unknowns, std::span<double> values);

  /// Solves the implicit unknowns of each zone for its components (bracketed Newton on each; a
  /// damped Newton on all when there are several). Failure names the zone by number and the
  /// implicit unknown.
  [[nodiscard]] core::Result<core::Done> solve_implicits(std::span<double> unknowns);

 private:
  struct Impl;
  std::unique_ptr<Impl> impl_;
};

}  // namespace stillzone::kinetics
