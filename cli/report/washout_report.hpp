#pragma once

#include <string>

#include "cli/report/run_report.hpp"
#include "network/washout/washout_analysis.hpp"

namespace stillzone::cli {

struct WashoutReportInput {
  const network::Case& the_case;
  const network::FlowBalance& balance;
  const network::Washout& washout;
  Provenance provenance;
};

/// The report of `stillzone washout`: one self-contained HTML page, UTF-8.
[[nodiscard]] std::string washout_report_page(const WashoutReportInput& input);

}  // namespace stillzone::cli
