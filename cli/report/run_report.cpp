#include "cli/report/run_report.hpp"

#include <fmt/format.h>

#include "cli/report/page.hpp"

namespace stillzone::cli {

std::string run_report_page(const RunReportInput& input) {
  Page page("Run report", input.the_case.title);
  HtmlTable zones{.caption = "Zones", .head = {"quantity", "unit"}, .rows = {}, .left = {}};
  page.add("zones", "Zones", html_of(zones));
  return page.html("");
}

}  // namespace stillzone::cli
