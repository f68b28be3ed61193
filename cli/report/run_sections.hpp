#pragma once

#include <string>

#include "cli/report/run_report.hpp"
#include "cli/report/zone_facts.hpp"

namespace stillzone::cli {

// The sections of the report of `run`, each as HTML, in the order of the page.

/// Three sentences: gas; outlet against zones; balances. Then warnings.
[[nodiscard]] std::string answer_section(const RunReportInput& input, const NetworkFacts& facts);
[[nodiscard]] std::string network_section(const RunReportInput& input, const NetworkFacts& facts);
/// The zones side by side, then every quantity.
[[nodiscard]] std::string zones_section(const RunReportInput& input, const NetworkFacts& facts);
[[nodiscard]] std::string gas_section(const RunReportInput& input);
/// Empty for a run without a history.
[[nodiscard]] std::string history_section(const RunReportInput& input);
[[nodiscard]] std::string inputs_section(const RunReportInput& input, const NetworkFacts& facts);
[[nodiscard]] std::string audits_section(const RunReportInput& input);
[[nodiscard]] std::string assumptions_section(const RunReportInput& input);
[[nodiscard]] std::string cautions_section();
[[nodiscard]] std::string provenance_section(const Provenance& provenance);

}  // namespace stillzone::cli
