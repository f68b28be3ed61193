#pragma once

#include <string>

#include "network/run_result.hpp"

namespace stillzone::cli {

/// series.csv: time_d, then one column per place.quantity with its unit in the header. Numbers in
/// the shortest form that reads back to the same double.
[[nodiscard]] std::string series_csv(const network::Series& series);

}  // namespace stillzone::cli
