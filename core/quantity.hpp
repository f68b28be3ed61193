#pragma once

#include <array>
#include <compare>

namespace stillzone::core {

/// What a quantity measures. The internal unit of each is in the comment; written units become
/// internal units in the readers (`core/units.hpp`) and nowhere else.
enum class Measure {
  volume,              // m3
  flow,                // m3/d
  duration,            // d
  rate,                // 1/d
  temperature,         // K
  temperature_change,  // K
  pressure,            // bar
  concentration,       // kg/m3
  mass,                // kg
  mass_flow,           // kg/d
  length,              // m
  area,                // m2
  density,             // kg/m3
  power,               // W
  energy,              // kWh
  unit_power,          // W/m3
  rotation,            // 1/d  (revolutions)
  dynamic_viscosity,   // Pa s
  stress,              // Pa
  gas_conductance,     // m3/d/bar
  heat_transfer,       // W/m2/K
  share,               // 1
};

/// A number whose measure is part of its type: a Volume where a FlowRate belongs does not compile.
template <Measure M>
class Quantity {
 public:
  constexpr Quantity() = default;
  explicit constexpr Quantity(double internal) : internal_(internal) {}
  /// In the internal unit listed at Measure.
  [[nodiscard]] constexpr double value() const { return internal_; }
  constexpr auto operator<=>(const Quantity&) const = default;
  friend constexpr Quantity operator+(Quantity a, Quantity b) {
    return Quantity(a.internal_ + b.internal_);
  }
  friend constexpr Quantity operator-(Quantity a, Quantity b) {
    return Quantity(a.internal_ - b.internal_);
  }
  friend constexpr Quantity operator*(double factor, Quantity a) {
    return Quantity(factor * a.internal_);
  }
  friend constexpr double operator/(Quantity a, Quantity b) { return a.internal_ / b.internal_; }

 private:
  double internal_ = 0.0;
};

using Volume = Quantity<Measure::volume>;                   ///< [m3]
using FlowRate = Quantity<Measure::flow>;                   ///< [m3/d]
using Duration = Quantity<Measure::duration>;               ///< [d]
using Rate = Quantity<Measure::rate>;                       ///< [1/d]
using Temperature = Quantity<Measure::temperature>;         ///< [K]
using Pressure = Quantity<Measure::pressure>;               ///< [bar]
using Concentration = Quantity<Measure::concentration>;     ///< [kg/m3]
using Mass = Quantity<Measure::mass>;                       ///< [kg]
using Length = Quantity<Measure::length>;                   ///< [m]
using Power = Quantity<Measure::power>;                     ///< [W]
using GasConductance = Quantity<Measure::gas_conductance>;  ///< [m3/d/bar]
using Share = Quantity<Measure::share>;                     ///< [1]

/// Hydraulic retention time V/Q [d]; Q > 0.
[[nodiscard]] constexpr Duration hydraulic_retention_time(Volume volume, FlowRate flow) {
  return Duration(volume.value() / flow.value());
}

}  // namespace stillzone::core
