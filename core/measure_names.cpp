#include <array>

#include "core/require.hpp"
#include "core/units.hpp"

namespace stillzone::core {
namespace {

struct MeasureWords {
  Measure measure;
  std::string_view name;
  std::string_view internal;
  std::string_view examples;
};

constexpr std::array<MeasureWords, 22> kWords = {{
    {Measure::volume, "a volume", "m3", "m3, L, gal, MG, ft3"},
    {Measure::flow, "a flow", "m3/d", "m3/d, m3/h, L/s, gpm, MGD"},
    {Measure::duration, "a duration", "d", "d, h, min, s, yr"},
    {Measure::rate, "a rate", "1/d", "1/d, 1/h"},
    {Measure::temperature, "a temperature", "K", "degC, degF, K"},
    {Measure::temperature_change, "a temperature difference", "K", "K, degC, degF"},
    {Measure::pressure, "a pressure", "bar", "bar, mbar, kPa, psi, inH2O"},
    {Measure::concentration, "a concentration", "kg/m3", "kg/m3, g/m3, mg/L, g/L"},
    {Measure::mass, "a mass", "kg", "kg, g, t, lb"},
    {Measure::mass_flow, "a mass flow", "kg/d", "kg/d, t/d, lb/d"},
    {Measure::length, "a length", "m", "m, mm, ft, in"},
    {Measure::area, "an area", "m2", "m2, ft2"},
    {Measure::density, "a density", "kg/m3", "kg/m3, g/L"},
    {Measure::power, "a power", "W", "W, kW, hp"},
    {Measure::energy, "an energy", "kWh", "kWh, MJ, Btu"},
    {Measure::unit_power, "a power per volume", "W/m3", "W/m3, kW/m3, hp/(1000 ft3)"},
    {Measure::rotation, "a speed of rotation", "1/d", "rpm, 1/s"},
    {Measure::dynamic_viscosity, "a dynamic viscosity", "Pa s", "Pa s, mPa s, cP"},
    {Measure::stress, "a stress", "Pa", "Pa, mPa"},
    {Measure::gas_conductance, "a pipe coefficient", "m3/d/bar", "m3/d/bar, m3/h/kPa"},
    {Measure::heat_transfer, "a heat transfer coefficient", "W/m2/K", "W/m2/K"},
    {Measure::share, "a share", "1", "%, or a bare number"},
}};

const MeasureWords& words(Measure measure) {
  for (const MeasureWords& entry : kWords) {
    if (entry.measure == measure) return entry;
  }
  throw_defect("known measure", __FILE__, __LINE__, "a measure without words");
}

}  // namespace

std::string_view measure_name(Measure measure) { return words(measure).name; }
std::string_view internal_unit(Measure measure) { return words(measure).internal; }
std::string_view example_units(Measure measure) { return words(measure).examples; }

}  // namespace stillzone::core
