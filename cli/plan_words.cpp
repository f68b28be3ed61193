#include "cli/plan_words.hpp"

#include <fmt/format.h>

#include <cmath>

#include "cli/text_table.hpp"

namespace stillzone::cli {
namespace {

using core::Json;

std::string with_unit(double value, const std::string& unit) {
  return short_number(value) + (unit == "1" ? "" : " " + unit);
}

std::string models_text(const network::TestPlan& plan) {
  TextTable table;
  table.column("If the tank is", TextTable::Align::left);
  table.column("parameter", TextTable::Align::left);
  table.column("suspected");
  table.column("expected std. error");
  table.column("equal spacing");
  table.column("geometric");
  for (const network::PlannedModel& model : plan.models) {
    for (std::size_t j = 0; j < model.values.size(); ++j) {
      const double se = model.standard_errors[j];
      table.row({j == 0 ? model.name : "", model.parameters[j].name,
                 with_unit(model.values[j], model.parameters[j].unit),
                 std::isfinite(se) ? with_unit(se, model.parameters[j].unit) : "not determined",
                 j == 0 && model.in_design ? percent(model.efficiency_equal) : "",
                 j == 0 && model.in_design ? percent(model.efficiency_geometric) : ""});
    }
  }
  return table.text() +
         "  The last two columns: information of as many equally or geometrically spaced samples, "
         "of the plan's.\n";
}

}  // namespace

std::string day_and_hour(double days) {
  const long minutes = std::lround(days * 1440.0);
  return fmt::format("{} d {:02}:{:02}", minutes / 1440, minutes / 60 % 24, minutes % 60);
}

std::string detection_in_words(const network::DetectionCurve& curve) {
  const std::string alarms = fmt::format("false alarms {}", percent(curve.power.front()));
  if (!curve.smallest) {
    return fmt::format("not seen in 80 % of tests up to {}; {}", percent(curve.magnitudes.back()),
                       alarms);
  }
  return fmt::format("seen in 80 % of tests from {} on; {}", percent(*curve.smallest), alarms);
}

std::string plan_tables(const network::PlanRequest& request, const network::TestPlan& plan) {
  const network::TracerTest& test = request.test;
  std::string text = fmt::format(
      "{}\n\n  Dose: {:.4g} kg of {} ({}).\n  Peak expected: {:.3g} g/m3 in the part that is "
      "mixed.\n  Length: {:.3g} d ({:.2g} turnovers of V/Q {:.3g} d), {} samples.\n\n",
      test.title, plan.mass / 1000.0, test.tracer, plan.mass_how, plan.peak, plan.times.back(),
      test.turnovers(plan.times.back()), test.volume.value() / test.mean_flow.value(),
      plan.times.size());
  TextTable table;
  table.column("sample");
  table.column("days after the dose");
  table.column("day and hour");
  for (std::size_t i = 0; i < plan.times.size(); ++i) {
    table.row(
        {std::to_string(i + 1), fmt::format("{:.3f}", plan.times[i]), day_and_hour(plan.times[i])});
  }
  text += table.text() + "\n" + models_text(plan) + "\n";
  text += fmt::format("What it would detect ({} simulated tests each, seed {})\n", request.draws,
                      request.seed);
  for (const network::DetectionCurve& curve : plan.detection) {
    text += fmt::format("  {}: {}\n", curve.fault, detection_in_words(curve));
  }
  for (const std::string& remark : plan.remarks) text += "  - " + remark + "\n";
  text +=
      "\nCautions: lithium salts are harmful if swallowed and irritate skin and eyes: gloves,\n"
      "goggles, safety data sheet; dissolve before dosing. Keep the concentration in the tank far\n"
      "below what harms the biology (common practice, no source), and ask the authority that\n"
      "grants the discharge or land-spreading permit first. Open digesters: biogas, H2S, "
      "pathogens,\n"
      "confined space. Local codes and licensed practice rule.\n";
  return text;
}

core::Json plan_summary(const network::PlanRequest& request, const network::TestPlan& plan) {
  const auto known = [](double value) {
    return std::isfinite(value) ? Json(value) : Json(nullptr);
  };
  Json models = Json::array();
  for (const network::PlannedModel& model : plan.models) {
    Json parameters = Json::object();
    for (std::size_t j = 0; j < model.values.size(); ++j) {
      parameters[model.parameters[j].name] = {{"suspected", model.values[j]},
                                              {"unit", model.parameters[j].unit},
                                              {"stderr", known(model.standard_errors[j])}};
    }
    models.push_back({{"name", model.name},
                      {"determined", model.in_design},
                      {"parameters", parameters},
                      {"efficiency_equal_spacing", model.efficiency_equal},
                      {"efficiency_geometric_spacing", model.efficiency_geometric}});
  }
  Json detection = Json::array();
  for (const network::DetectionCurve& curve : plan.detection) {
    detection.push_back(
        {{"fault", curve.fault},
         {"seen_when", curve.how},
         {"magnitudes", curve.magnitudes},
         {"power", curve.power},
         {"smallest_at_80_percent", curve.smallest ? Json(*curve.smallest) : Json(nullptr)}});
  }
  return {{"kind", "plan"},
          {"title", request.test.title},
          {"tracer", request.test.tracer},
          {"mass_kg", plan.mass / 1000.0},
          {"mass_how", plan.mass_how},
          {"peak_g_m3", plan.peak},
          {"sampling_times_d", plan.times},
          {"models", models},
          {"detection", detection},
          {"simulated_tests", request.draws},
          {"seed", request.seed},
          {"warnings", plan.remarks}};
}

std::string sampling_sheet(const network::TestPlan& plan) {
  std::string text = "sample,planned_d,planned,taken_d,value_g_m3,remark\n";
  for (std::size_t i = 0; i < plan.times.size(); ++i) {
    text += fmt::format("{},{:.4f},{},,,\n", i + 1, plan.times[i], day_and_hour(plan.times[i]));
  }
  return text;
}

}  // namespace stillzone::cli
