#pragma once

#include <string>

#include "network/case.hpp"
#include "network/run_result.hpp"

namespace stillzone::cli {

/// What `stillzone run` prints: zones, outlets, headspaces, balances, how it was solved.
[[nodiscard]] std::string run_tables(const network::Case& the_case,
                                     const network::RunResult& result);

}  // namespace stillzone::cli
