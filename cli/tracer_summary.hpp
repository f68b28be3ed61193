#pragma once

#include <string>
#include <vector>

#include "core/json_document.hpp"
#include "network/tracer/tracer_analysis.hpp"

namespace stillzone::cli {

/// summary.json of `tracer`.
[[nodiscard]] core::Json tracer_summary(const network::TracerTest& test,
                                        const network::TracerAnalysis& analysis,
                                        const std::vector<std::string>& warnings);

}  // namespace stillzone::cli
