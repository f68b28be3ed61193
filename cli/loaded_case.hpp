#pragma once

#include <optional>
#include <string>

#include "cli/command_line.hpp"
#include "core/json_document.hpp"
#include "network/case.hpp"
#include "network/flow_balance.hpp"

namespace stillzone::cli {

/// A case file read, changed by --set, validated and balanced.
struct LoadedCase {
  core::JsonDocument document;
  network::Case the_case;
  network::FlowBalance balance;
  std::string text;  ///< the file as it stands, for provenance
};

/// All faults go to console.err; nothing is returned then.
[[nodiscard]] std::optional<LoadedCase> load_case(const CommandLine& line, Console& console);

}  // namespace stillzone::cli
