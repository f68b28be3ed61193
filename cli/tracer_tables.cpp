#include "cli/tracer_tables.hpp"

#include <fmt/format.h>

#include <algorithm>
#include <cmath>

#include "cli/text_table.hpp"
#include "core/csv_table.hpp"

namespace stillzone::cli {
namespace {

using network::FittedParameter;
using network::ModelFit;

std::string with_error(double value, double error, const std::string& unit) {
  std::string text = short_number(value);
  if (std::isfinite(error) && error > 0.0) text += fmt::format(" +- {:.2g}", error);
  return text + (unit.empty() ? "" : " " + unit);
}

std::string moments_text(const network::PointResult& point) {
  if (!point.moments) return fmt::format("At {}: no moments ({}).\n", point.at, point.reason);
  const network::TracerMoments& m = *point.moments;
  TextTable table;
  table.column(fmt::format("At {}, without a model", point.at), TextTable::Align::left);
  table.column("", TextTable::Align::left);
  table.row({"tracer recovered", with_error(100.0 * m.recovery, 100.0 * m.errors.recovery, "%")});
  table.row({"nominal retention time V/Q", with_error(m.hydraulic_retention_time, 0.0, "d")});
  table.row({"mean residence time", with_error(m.mean, m.errors.mean, "d")});
  table.row({"variance", with_error(m.variance, m.errors.variance, "d2")});
  table.row({"volume that takes part", percent(m.active_fraction)});
  table.row({"t10, t50, t90", fmt::format("{}, {}, {} d", short_number(m.t10), short_number(m.t50),
                                          short_number(m.t90))});
  table.row({"Morrill index t90/t10 (mixed tank 21.9, plug 1)",
             m.morrill > 0.0 ? short_number(m.morrill) : "not known"});
  table.row({"baffling factor t10/(V/Q)", short_number(m.baffling)});
  table.row({"extrapolated tail", percent(m.tail.share)});
  table.row({"integration rule", network::rule_name(m.curve.rule())});
  std::string text = table.text();
  for (const std::string& sentence : m.verdict) text += "  " + sentence + "\n";
  return text;
}

std::string ranking_text(const network::TracerAnalysis& analysis) {
  TextTable table;
  table.column("");
  table.column("Model", TextTable::Align::left);
  table.column("AICc");
  table.column("behind");
  table.column("weight");
  table.column("RMSE g/m3");
  table.column("Parameters", TextTable::Align::left);
  for (std::size_t i = 0; i < analysis.models.size(); ++i) {
    const ModelFit& fit = analysis.models[i].fit;
    std::string parameters;
    for (const FittedParameter& p : fit.parameters) {
      parameters +=
          fmt::format("{}{} {}{}{}", parameters.empty() ? "" : ", ", p.name, short_number(p.value),
                      p.unit == "1" ? "" : " " + p.unit, p.identified ? "" : " (?)");
    }
    table.row({std::to_string(i + 1), fit.name, fmt::format("{:.1f}", fit.aicc),
               fmt::format("{:.1f}", fit.aicc - analysis.models.front().fit.aicc),
               percent(fit.weight), short_number(fit.rmse), parameters});
  }
  std::string text = table.empty() ? "" : table.text();
  if (!table.empty()) text += "  (?) not identified by this test\n";
  for (const network::FailedModel& failed : analysis.failed) {
    text += fmt::format("  {}: not fitted. {}\n", failed.name, failed.reason);
  }
  return text;
}

std::string interval(const FittedParameter& p) {
  return fmt::format("{} to {}", p.low ? short_number(*p.low) : "(open)",
                     p.high ? short_number(*p.high) : "(open)");
}

std::string best_text(const network::RankedModel& best) {
  TextTable table;
  table.column(fmt::format("Best: {}", best.fit.name), TextTable::Align::left);
  table.column("value");
  table.column("std. error");
  table.column("95 % interval");
  table.column("unit", TextTable::Align::left);
  table.column("", TextTable::Align::left);
  for (const FittedParameter& p : best.fit.parameters) {
    table.row({p.name, short_number(p.value),
               std::isfinite(p.standard_error) ? short_number(p.standard_error) : "none",
               interval(p), p.unit, p.verdict});
  }
  std::string text = table.text();
  for (const auto* list : {&best.fit.tests.words, &best.fit.remarks}) {
    for (const std::string& sentence : *list) text += "  " + sentence + "\n";
  }
  return text;
}

std::string decay_text(const network::TracerAnalysis& analysis) {
  TextTable table;
  table.column("Left of a first-order decay at", TextTable::Align::left);
  table.column("ideal tank");
  table.column("plug flow");
  table.column("this curve");
  const bool fitted = !analysis.models.empty();
  table.column(fitted ? analysis.models.front().fit.name : "");
  for (std::size_t i = 0; i < analysis.conversion.size(); ++i) {
    const network::ConversionRow& row = analysis.conversion[i];
    std::string model;
    if (fitted) {
      const network::Estimate& left = analysis.models.front().insight.left[i];
      model = fmt::format("{:.2f} +- {:.2f} %", 100.0 * left.value, 100.0 * left.standard_error);
    }
    table.row({fmt::format("{:.4g} 1/d", row.rate), fmt::format("{:.2f} %", 100.0 * row.ideal_tank),
               fmt::format("{:.2g} %", 100.0 * row.plug_flow),
               std::isfinite(row.data) ? fmt::format("{:.2f} %", 100.0 * row.data) : "n/a", model});
  }
  for (std::size_t i = 0; i < analysis.young.size(); ++i) {
    const network::YoungRow& row = analysis.young[i];
    std::string model;
    if (fitted) {
      const network::Estimate& share = analysis.models.front().insight.younger[i];
      model = fmt::format("{:.2f} +- {:.2f} %", 100.0 * share.value, 100.0 * share.standard_error);
    }
    table.row({fmt::format("feed out before {:.3g} d", row.age),
               fmt::format("{:.2f} %", 100.0 * row.ideal_tank), "0 %",
               std::isfinite(row.data) ? fmt::format("{:.2f} %", 100.0 * row.data) : "n/a", model});
  }
  return table.text();
}

}  // namespace

std::string tracer_tables(const network::TracerTest& test, const network::TracerAnalysis& analysis,
                          const std::vector<std::string>& warnings) {
  std::string text = test.title + "\n\n";
  for (const network::PointResult& point : analysis.points) text += moments_text(point) + "\n";
  text += ranking_text(analysis) + "\n";
  if (!analysis.models.empty()) text += best_text(analysis.models.front()) + "\n";
  text += decay_text(analysis);
  text += "\nWhat this test cannot tell\n";
  for (const std::string& sentence : analysis.cannot_tell) text += "  - " + sentence + "\n";
  if (!warnings.empty()) text += "\nNotes on the data\n";
  for (const std::string& warning : warnings) text += "  - " + warning + "\n";
  text +=
      "\nCautions: lithium salts are harmful, and sampling an open digester meets biogas, H2S,\n"
      "pathogens and confined space: local codes, safety data sheets and licensed practice rule.\n";
  return text;
}

std::string fits_csv(const network::TracerTest& test, const network::TracerAnalysis& analysis) {
  std::string text = "at,time_d,turnovers,measured_net_g_m3,deviation_g_m3,below_limit";
  for (const auto& ranked : analysis.models) {
    text += "," + core::csv_cell(ranked.fit.name + "_fitted_g_m3");
    text += "," + core::csv_cell(ranked.fit.name + "_residual");
  }
  text += "\n";
  if (analysis.models.empty()) return text;
  // A model fitted to all points has every sample; the best one does when any does.
  for (const network::FittedSample& sample : analysis.models.front().fit.samples) {
    text += fmt::format("{},{},{},{},{},{}", core::csv_cell(test.points[sample.point].at),
                        core::csv_number(sample.time), core::csv_number(sample.theta),
                        core::csv_number(sample.measured), core::csv_number(sample.deviation),
                        sample.censored ? "yes" : "no");
    for (const auto& ranked : analysis.models) {
      const auto same = std::ranges::find_if(ranked.fit.samples, [&](const auto& other) {
        return other.point == sample.point && other.time <= sample.time &&
               other.time >= sample.time;
      });
      const bool found = same != ranked.fit.samples.end();
      text += "," + (found ? core::csv_number(same->fitted) : "") + "," +
              (found ? core::csv_number(same->residual) : "");
    }
    text += "\n";
  }
  return text;
}

}  // namespace stillzone::cli
