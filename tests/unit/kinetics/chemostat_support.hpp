#pragma once

#include <array>
#include <cmath>
#include <complex>
#include <cstddef>

#include "kinetics/kinetic_model.hpp"
#include "kinetics/zone_kinetics.hpp"

namespace stillzone::kinetics {

/// A small invented model with everything a model can have: substrate S and biomass X (Monod
/// growth, pH inhibition, decay), inorganic carbon with an acid constant that depends on
/// temperature, cations, pH from the charge balance, and carbon dioxide that passes into the gas.
[[nodiscard]] KineticModel chemostat_model();

inline constexpr std::size_t kChemostatUnknowns = 5;  // S, X, C, cations, pH
inline constexpr std::size_t kChemostatRows = 6;      // sources, charge balance, transfer

/// The same model written by hand, for real and complex numbers.
/// @param y S, X, C, cations, pH, carbon dioxide in the gas
/// @return source of S, X, C, cations; charge balance; transfer
template <class Number>
std::array<Number, kChemostatRows> chemostat_by_hand(const std::array<Number, 6>& y,
                                                     const ZoneConditions& conditions) {
  using std::exp;
  using std::pow;
  const double t = conditions.temperature;
  const Number proton = exp(-std::log(10.0) * y[4]);
  const double acid = 4.5e-7 * std::exp(7646.0 / 8.3145e-2 * (1.0 / 298.15 - 1.0 / t) / 1000.0);
  const double water = 1e-14 * std::exp(55900.0 / 8.3145 * (1.0 / 298.15 - 1.0 / t));
  const double growth = 0.4 * std::pow(1.035, t - 308.15);
  const double henry = 0.035 * std::exp(2400.0 * (1.0 / t - 1.0 / 298.15));
  const Number bicarbonate = acid * y[2] / (acid + proton);
  const Number inhibition =
      std::pow(10.0, -5.5 * 2.5) / (std::pow(10.0, -5.5 * 2.5) + pow(proton, 2.5));
  const Number rate = growth * y[0] / (0.15 + y[0]) * inhibition * y[1];
  const Number decay = 0.02 * y[1];
  const Number pressure = y[5] * (0.083145 * conditions.gas_temperature);
  const Number transfer = conditions.gas_transfer * (y[2] - bicarbonate - henry * pressure);
  return {-10.0 * rate,
          rate - decay,
          0.3 * rate + 0.01 * decay - transfer,
          Number(0.0),
          y[3] + proton - water / proton - bicarbonate,
          transfer};
}

}  // namespace stillzone::kinetics
