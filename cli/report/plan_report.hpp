#pragma once

#include <string>

#include "cli/report/run_report.hpp"
#include "network/tracer/test_plan.hpp"

namespace stillzone::cli {

struct PlanReportInput {
  const network::PlanRequest& request;
  const network::TestPlan& plan;
  Provenance provenance;
};

/// The report of `stillzone plan`: one self-contained HTML page, UTF-8, no network.
[[nodiscard]] std::string plan_report_page(const PlanReportInput& input);

}  // namespace stillzone::cli
