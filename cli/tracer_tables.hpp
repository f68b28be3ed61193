#pragma once

#include <string>
#include <vector>

#include "network/tracer/tracer_analysis.hpp"

namespace stillzone::cli {

/// What `tracer` prints: the data, the ranking, the best model's parameters, what is open.
[[nodiscard]] std::string tracer_tables(const network::TracerTest& test,
                                        const network::TracerAnalysis& analysis,
                                        const std::vector<std::string>& warnings);

/// Samples beside the fits of all models, one line per sample.
[[nodiscard]] std::string fits_csv(const network::TracerTest& test,
                                   const network::TracerAnalysis& analysis);

}  // namespace stillzone::cli
