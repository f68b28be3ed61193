#pragma once

#include <optional>
#include <string>

#include "network/run_result.hpp"

namespace stillzone::cli {

/// Time mean of a recorded column by the trapezoid, over the whole history; none when there is no
/// such column or fewer than two records. For states, which do not jump.
[[nodiscard]] std::optional<double> series_mean(const network::Series& series,
                                                const std::string& place,
                                                const std::string& quantity);

}  // namespace stillzone::cli
