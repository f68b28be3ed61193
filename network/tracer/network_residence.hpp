#pragma once

#include <memory>
#include <string>
#include <vector>

#include "network/tracer/rtd_model.hpp"
#include "network/tracer/water_network.hpp"

namespace stillzone::network {

/// Residence times of a water network between one feed and all outlets together, as an RtdModel:
/// exact by matrix exponentials and linear solves.
///   E(s) = b + w (s I - A)^-1 e,  e: entry per unit of feed, w: shares of the outflow
/// @param days_per_turnover [d] the nominal V/Q that theta counts
[[nodiscard]] std::unique_ptr<const RtdModel> network_residence(
    std::shared_ptr<const WaterNetwork> network, std::size_t feed, double days_per_turnover,
    std::string name, std::vector<RtdParameter> parameters);

}  // namespace stillzone::network
