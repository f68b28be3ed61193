#pragma once

#include <string>
#include <vector>

#include "cli/report/run_report.hpp"
#include "network/tracer/tracer_analysis.hpp"
#include "network/tracer/tracer_test.hpp"

namespace stillzone::cli {

/// What the report of `stillzone tracer` is made from.
struct TracerReportInput {
  const network::TracerTest& test;
  const network::TracerAnalysis& analysis;  ///< points as in the test; models best first
  Provenance provenance;
  const std::vector<std::string>& remarks;  ///< of the command, in plain sentences
};

/// The report of `stillzone tracer`: one self-contained HTML page, UTF-8, no network.
/// @return the whole text of report.html
[[nodiscard]] std::string tracer_report_page(const TracerReportInput& input);

}  // namespace stillzone::cli
