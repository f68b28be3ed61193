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

/// The load down to which a failed state stays possible beside the healthy one: "1.12", "below 0.2"
/// when the branch past the fold was followed no further, "-" where there is no fold.
[[nodiscard]] std::string return_cell(const network::LoadCurve& curve);

/// What a group does in a zone, in a word: "sustains itself" (net growth meets the zone's whole
/// outflow), "grows" (growth exceeds decay), "carried in" (decays there, kept up by what flows in),
/// "absent".
[[nodiscard]] std::string life_in_zone(const network::Case& the_case,
                                       const network::GroupWashout& group, std::size_t zone);

}  // namespace stillzone::cli
