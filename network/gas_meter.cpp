#include "network/gas_meter.hpp"

namespace stillzone::network {
namespace {

constexpr double kNormalTemperature = 273.15;  // K
constexpr double kNormalPressure = 1.01325;    // bar

}  // namespace

GasMeter::GasMeter(const Headspace& headspace, const kinetics::KineticModel& model, double vapour)
    : back_pressure_(headspace.pipe.back_pressure.value()),
      vapour_(vapour),
      normal_per_bar_(kNormalTemperature / (headspace.temperature.value() * kNormalPressure)),
      methane_per_unit_(0.0) {
  for (std::size_t g = 0; g < model.gases.size(); ++g) {
    if (model.gases[g].role != "methane") continue;
    methane_ = g;
    methane_per_unit_ =
        model.gases[g].kmol_per_unit * model.gas_constant * kNormalTemperature / kNormalPressure;
  }
}

GasMeter::Flows GasMeter::flows(std::span<const double> gases, double pressure, double flow) const {
  Flows read{};
  read[kWet] = flow * pressure / back_pressure_;
  read[kNormalDry] = flow * (pressure - vapour_) * normal_per_bar_;
  if (methane_) read[kMethane] = flow * gases[*methane_] * methane_per_unit_;
  return read;
}

GasMeter::Flows GasMeter::flows_along(std::span<const double> gases,
                                      std::span<const double> gases_along, double pressure,
                                      double pressure_along, double flow, double flow_along) const {
  Flows read{};
  read[kWet] = (flow_along * pressure + flow * pressure_along) / back_pressure_;
  read[kNormalDry] = (flow_along * (pressure - vapour_) + flow * pressure_along) * normal_per_bar_;
  if (methane_) {
    read[kMethane] =
        (flow_along * gases[*methane_] + flow * gases_along[*methane_]) * methane_per_unit_;
  }
  return read;
}

}  // namespace stillzone::network
