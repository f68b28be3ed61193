#include "cli/report/tracer_report.hpp"

#include "cli/report/page.hpp"
#include "cli/report/run_sections.hpp"
#include "cli/report/tracer_sections.hpp"

namespace stillzone::cli {

std::string tracer_report_page(const TracerReportInput& input) {
  Page page("Tracer test report", input.test.title);
  page.add("answer", "The answer", tracer_answer_section(input));
  page.add("curve", "The curve", tracer_curve_section(input));
  if (!input.analysis.models.empty()) {
    page.add("residuals", "Residuals", tracer_residual_section(input));
  }
  page.add("ranking", "Models compared", tracer_ranking_section(input));
  if (!input.analysis.models.empty()) {
    page.add("parameters", "Parameters", tracer_parameter_section(input));
    page.add("networks", "The tank as zones", tracer_network_section(input));
  }
  page.add("moments", "Without a model", tracer_moments_section(input));
  page.add("mixing", "What the mixing does", tracer_mixing_section(input));
  page.add("open", "What this test cannot tell", tracer_open_section(input));
  page.add("inputs", "Inputs as read", tracer_inputs_section(input));
  page.add("assumed", "What was assumed", tracer_assumptions_section(input));
  page.add("cautions", "Cautions", tracer_cautions_section(input));
  page.add("provenance", "Provenance", provenance_section(input.provenance));
  return page.html(
      "<footer class=sign><div><span>prepared by</span><span>date</span></div><div><span>checked "
      "by</span><span>date</span></div></footer>\n");
}

}  // namespace stillzone::cli
