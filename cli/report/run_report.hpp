#pragma once

#include <string>

#include "network/case.hpp"
#include "network/flow_balance.hpp"
#include "network/run_result.hpp"

namespace stillzone::cli {

/// Where a report comes from, so that someone else can make it again.
struct Provenance {
  std::string version;       ///< of the program
  std::string input_name;    ///< as written on the command line
  std::string input_text;    ///< the file as it stands
  std::string command_line;  ///< the whole line, program name included
  std::string date;          ///< when the run ended, "2026-01-31 14:05 UTC"
};

struct RunReportInput {
  const network::Case& the_case;
  const network::FlowBalance& balance;
  const network::RunResult& result;
  Provenance provenance;
};

/// The report of `stillzone run`: one self-contained HTML page, UTF-8, no network, below 1 MB for
/// 200 days of 10 zones. Its charts hold every extreme of a history (cli/report/decimation.hpp).
/// @return the whole text of report.html
[[nodiscard]] std::string run_report_page(const RunReportInput& input);

}  // namespace stillzone::cli
