#pragma once

#include <string>
#include <vector>

#include "core/dae/integrator.hpp"

namespace stillzone::network {

/// A named value with its unit, in the order to show.
struct NamedValue {
  std::string name;
  std::string unit;
  double value = 0.0;
};

/// One place's state: components, implicit unknowns (pH), then derived quantities.
struct PlaceState {
  std::string place;
  std::vector<NamedValue> state;
  std::vector<NamedValue> derived;
};

struct OutletResult {
  std::string name;
  double flow = 0.0;  ///< [m3/d]
  PlaceState state;   ///< flow-weighted mean of what enters it; pH of the mixed water
};

struct HeadspaceResult {
  std::string name;
  PlaceState state;       ///< gas concentrations; partial pressures [bar] among the derived
  double pressure = 0.0;  ///< [bar] total, water vapour included
  double gas_flow = 0.0;  ///< [m3/d] wet, at the pipe's back pressure
  double gas_flow_normal_dry = 0.0;  ///< [m3/d] 0 degC, 1.01325 bar
  double methane_flow_normal = 0.0;  ///< [m3/d] same conditions
  double methane_share_dry = 0.0;    ///< [1] of the dry gas
  bool pipe_open = true;
  /// Time means over the run [m3/d], exact (integrated beside the state); of a steady state the
  /// values above.
  double mean_gas_flow = 0.0;
  double mean_gas_flow_normal_dry = 0.0;
  double mean_methane_flow_normal = 0.0;
};

struct FlowResult {
  std::string from;
  std::string to;
  double flow = 0.0;  ///< [m3/d] as balanced; in a dynamic run the time mean
};

/// Closure of one conserved quantity over the whole run: in = out + stored change.
struct Balance {
  std::string name;     ///< "water", "COD", "C", "N"
  std::string unit;     ///< "m3", "kg COD", ...
  double inflow = 0.0;  ///< over the run (steady: per day)
  double liquid_out = 0.0;
  double gas_out = 0.0;
  double stored_change = 0.0;
  double made = 0.0;  ///< what the published model itself creates or destroys (0 when it closes)
  double relative_error = 0.0;
};

/// History of a dynamic run: columns of "place.quantity".
struct Series {
  std::vector<double> time;  ///< [d]
  struct Column {
    std::string place;
    std::string quantity;
    std::string unit;
    std::vector<double> values;  ///< one per time
  };
  std::vector<Column> columns;
};

struct RunResult {
  std::string kind;    ///< "steady", "dynamic", "periodic"
  double until = 0.0;  ///< [d] time of the states below; 0 for a steady state
  std::vector<PlaceState> zones;
  std::vector<OutletResult> outlets;
  std::vector<HeadspaceResult> headspaces;
  std::vector<FlowResult> flows;
  std::vector<Balance> balances;
  core::IntegratorCounts solver;
  std::size_t unknowns = 0;
  double seconds = 0.0;       ///< wall clock of the computation
  std::string solution_note;  ///< how the steady state was found, or why the run ended
  Series series;              ///< empty for a steady state
  std::vector<std::string> warnings;
};

}  // namespace stillzone::network
