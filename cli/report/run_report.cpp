#include "cli/report/run_report.hpp"

#include "cli/report/page.hpp"
#include "cli/report/run_sections.hpp"
#include "cli/report/zone_facts.hpp"

namespace stillzone::cli {

std::string run_report_page(const RunReportInput& input) {
  const NetworkFacts facts = network_facts(input);
  Page page("Run report", input.the_case.title);
  page.add("answer", "The answer", answer_section(input, facts));
  page.add("network", "The network", network_section(input, facts));
  page.add("zones", "Zones side by side", zones_section(input, facts));
  page.add("gas", "Gas", gas_section(input));
  if (const std::string history = history_section(input); !history.empty()) {
    page.add("history", "History", history);
  }
  page.add("inputs", "Inputs", inputs_section(input, facts));
  page.add("audits", "Audits", audits_section(input));
  page.add("assumed", "What was assumed", assumptions_section(input));
  page.add("cautions", "Cautions", cautions_section());
  page.add("provenance", "Provenance", provenance_section(input.provenance));
  return page.html(
      "<footer class=sign><div><span>prepared by</span><span>date</span></div><div><span>checked "
      "by</span><span>date</span></div></footer>\n");
}

}  // namespace stillzone::cli
