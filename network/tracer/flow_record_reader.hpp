#pragma once

#include <optional>
#include <string>
#include <vector>

#include "core/json_reader.hpp"
#include "core/timeline.hpp"
#include "network/tracer/test_columns.hpp"

namespace stillzone::network {

/// Reads the flow of a tracer test as a record: {"csv", "time": {"column", "unit" | "dates"},
/// "value": {"column", "unit"}}. Each flow [m3/d] holds until the next row, the first also before.
/// Rows without a time or value are left out (the row before holds on), order is restored; two rows
/// of one time and flows below zero are faults. What was mended goes into `notes`.
std::optional<core::Timeline> read_flow_record(core::ObjectReader& reader, const TestClock& clock,
                                               double dose_at, std::vector<std::string>& notes);

}  // namespace stillzone::network
