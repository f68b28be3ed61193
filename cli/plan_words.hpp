#pragma once

#include <string>

#include "core/json_document.hpp"
#include "network/tracer/test_plan.hpp"

namespace stillzone::cli {

/// What `plan` prints.
[[nodiscard]] std::string plan_tables(const network::PlanRequest& request,
                                      const network::TestPlan& plan);
/// summary.json of `plan`.
[[nodiscard]] core::Json plan_summary(const network::PlanRequest& request,
                                      const network::TestPlan& plan);
/// The sampling sheet to be filled in, as CSV that `tracer` reads.
[[nodiscard]] std::string sampling_sheet(const network::TestPlan& plan);

/// "2 d 03:20" of a time in days.
[[nodiscard]] std::string day_and_hour(double days);
/// "seen from 10 % on", or that it is not.
[[nodiscard]] std::string detection_in_words(const network::DetectionCurve& curve);

}  // namespace stillzone::cli
