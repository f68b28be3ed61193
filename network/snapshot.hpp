#pragma once

#include <cstddef>
#include <memory>
#include <span>
#include <vector>

#include "kinetics/zone_kinetics.hpp"
#include "network/case.hpp"
#include "network/digester_system.hpp"
#include "network/operation.hpp"

namespace stillzone::network {

/// A headspace and its gas at one instant.
struct HeadspaceReading {
  double pressure = 0.0;                 ///< [bar] total, water vapour included
  double vapour_pressure = 0.0;          ///< [bar]
  std::vector<double> partial_pressure;  ///< [bar] one per gas
  double flow = 0.0;                     ///< [m3/d] wet, at back pressure
  double flow_normal_dry = 0.0;          ///< [m3/d] 0 degC, 1.01325 bar
  double methane_flow_normal = 0.0;      ///< [m3/d] the same conditions
  double methane_share_dry = 0.0;        ///< [1]
  bool pipe_open = false;
};

/// All that is shown of a digester at one instant beside its state.
struct Snapshot {
  std::vector<double> zone_derived;    ///< n_zones * n_derived
  std::vector<double> feed_flow;       ///< [m3/d] one per feed
  std::vector<double> outlet_flow;     ///< [m3/d] one per outlet
  std::vector<double> outlet_state;    ///< n_outlets * n_zone_unknowns: of the mixed water
  std::vector<double> outlet_derived;  ///< n_outlets * n_derived
  std::vector<HeadspaceReading> headspaces;
};

/// Works out snapshots. The water of an outlet is the flow-weighted mean of the streams that enter
/// it (feeds that bypass the zones included), its implicit unknowns (pH) those of the mixture. An
/// outlet through which nothing flows shows the plain mean of where its water would come from.
class SnapshotMaker {
 public:
  /// Both must outlive this object.
  SnapshotMaker(const Case& the_case, DigesterSystem& system);

  /// @param y state of the system, size n_unknowns
  /// @param point rates (of an instant, or means) and feed states to mix the outlets with
  [[nodiscard]] Snapshot at(std::span<const double> y, const OperatingPoint& point);

 private:
  void mix_outlets(std::span<const double> y, const OperatingPoint& point, Snapshot& snapshot);
  [[nodiscard]] HeadspaceReading headspace(std::span<const double> y, std::size_t index) const;

  const Case& case_;
  DigesterSystem& system_;
  StateLayout layout_;
  bool one_temperature_ = true;
  std::vector<kinetics::ZoneConditions> outlet_conditions_;
  std::unique_ptr<kinetics::ZoneKinetics> outlets_;
  std::vector<double> outlet_implicits_;  ///< of the last snapshot: where the next search starts
};

}  // namespace stillzone::network
