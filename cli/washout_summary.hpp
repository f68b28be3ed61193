#pragma once

#include <string>

#include "core/json_document.hpp"
#include "network/washout/washout_analysis.hpp"

namespace stillzone::cli {

/// summary.json of `washout`: the contract's keys first, then margins, zones, cautions. What was
/// not worked out or does not exist is null.
[[nodiscard]] core::Json washout_summary(const network::Case& the_case,
                                         const network::Washout& washout);

/// curve.csv: one line per point of each branch (digester: network, ideal; branch: main, beyond).
[[nodiscard]] std::string washout_curve_csv(const network::Case& the_case,
                                            const network::Washout& washout);

/// Unit of the model's VFA; "" when it has none.
[[nodiscard]] std::string vfa_unit(const network::Case& the_case);

/// How the healthy branch ends, in a few words: "fold: the steady state ends".
[[nodiscard]] std::string end_of_curve(const network::LoadCurve& curve);

}  // namespace stillzone::cli
