#pragma once

#include <string>

#include "network/washout/washout_analysis.hpp"

namespace stillzone::cli {

/// What `stillzone washout` prints: criterion, critical loads, groups by zone, cautions.
[[nodiscard]] std::string washout_tables(const network::Case& the_case,
                                         const network::Washout& washout);

/// The first paragraph of the output and of the report: three or four sentences, plain text.
[[nodiscard]] std::vector<std::string> washout_answer(const network::Case& the_case,
                                                      const network::Washout& washout);

/// What a group does in a zone, in a word: "sustains itself" (net growth meets the zone's whole
/// outflow), "grows" (growth exceeds decay), "carried in" (decays there, kept up by what flows in),
/// "absent".
[[nodiscard]] std::string life_in_zone(const network::Case& the_case,
                                       const network::GroupWashout& group, std::size_t zone);

}  // namespace stillzone::cli
