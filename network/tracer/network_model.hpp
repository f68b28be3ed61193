#pragma once

#include <memory>
#include <string>
#include <vector>

#include "core/json_document.hpp"
#include "core/units.hpp"
#include "network/tracer/tracer_model.hpp"

namespace stillzone::network {

/// A user's case as a tracer model. Its parameters are the quantities that carry "fit" and move
/// water: volumes of zones, flows, shares, feed flows, named by their JSON pointer. Flows of the
/// case hold at the test's mean flow; when the flow varies all of them vary with it (time is
/// counted in turnovers).
struct UserNetwork {
  std::unique_ptr<const TracerModel> model;
  std::vector<std::string> remarks;  ///< what does not act on a tracer, what does not agree
};

/// Reads, balances and binds a case to a test: where the dose enters, where samples are taken.
/// Faults: those of the case; nothing free that moves water; a sampling point or dose place that
/// the case does not have; a free quantity that continuity or shares do not leave free.
/// @return empty when there was a fault
[[nodiscard]] std::optional<UserNetwork> load_user_network(const std::filesystem::path& path,
                                                           const std::string& name,
                                                           const TracerTest& test,
                                                           const core::UnitReader& units,
                                                           core::FaultList& faults);

/// The same from a document already read. @param name of the model, as the test calls it
[[nodiscard]] std::optional<UserNetwork> bind_user_network(const core::JsonDocument& document,
                                                           const std::string& name,
                                                           const TracerTest& test,
                                                           const core::UnitReader& units,
                                                           core::FaultList& faults);

}  // namespace stillzone::network
