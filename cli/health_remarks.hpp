#pragma once

#include <string>
#include <vector>

#include "network/case.hpp"
#include "network/run_result.hpp"

namespace stillzone::cli {

/// What an operator would worry about in the zones of a result: pH outside 6.6 to 8.2, VFA over
/// 0.4 of the alkalinity (as acetic acid and calcium carbonate), a microbial group that is at home
/// in one zone while most of the tank has lost it. Limits: common practice, no source. Only for
/// models that have these quantities.
[[nodiscard]] std::vector<std::string> health_remarks(const network::Case& the_case,
                                                      const network::RunResult& result);

}  // namespace stillzone::cli
