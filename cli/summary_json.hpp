#pragma once

#include "core/json_document.hpp"
#include "network/run_result.hpp"

namespace stillzone::cli {

/// summary.json of a run: the contract's keys, all numbers as computed, in model units.
[[nodiscard]] core::Json run_summary(const network::RunResult& result, const std::string& title);

}  // namespace stillzone::cli
