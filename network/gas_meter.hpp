#pragma once

#include <array>
#include <cstddef>
#include <optional>
#include <span>
#include <vector>

#include "network/case.hpp"

namespace stillzone::network {

/// What a gas meter behind a headspace's pipe counts. Flows [m3/d]; integrated beside the state
/// they are volumes [m3], from which the time means of a run follow exactly.
class GasMeter {
 public:
  enum Reading : std::size_t {
    kWet,        ///< at the pipe's back pressure and the headspace's temperature, vapour included
    kNormalDry,  ///< 0 degC, 1.01325 bar, vapour taken off
    kMethane,    ///< the methane of it, same conditions
  };
  static constexpr std::size_t kReadings = 3;
  using Flows = std::array<double, kReadings>;

  /// @param vapour [bar] water vapour in the headspace
  GasMeter(const Headspace& headspace, const kinetics::KineticModel& model, double vapour);

  /// @param gases concentrations in the headspace; @param pressure [bar] total
  /// @param flow [m3/d] out of the pipe, at headspace conditions
  [[nodiscard]] Flows flows(std::span<const double> gases, double pressure, double flow) const;
  /// Change along a direction of the gases that moves pressure and flow by the amounts given.
  [[nodiscard]] Flows flows_along(std::span<const double> gases,
                                  std::span<const double> gases_along, double pressure,
                                  double pressure_along, double flow, double flow_along) const;

 private:
  double back_pressure_;
  double vapour_;
  double normal_per_bar_;    ///< [1/bar] of dry gas: 273.15 K / (T 1.01325 bar)
  double methane_per_unit_;  ///< [m3 normal per unit of the methane component]; 0 without methane
  std::optional<std::size_t> methane_;
};

}  // namespace stillzone::network
