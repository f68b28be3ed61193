#include "cli/tracer_summary.hpp"

#include <cmath>

namespace stillzone::cli {
namespace {

using core::Json;

/// JSON has no infinity: what the test does not tell is null.
Json known(double value) { return std::isfinite(value) ? Json(value) : Json(nullptr); }
Json known(const std::optional<double>& value) { return value ? known(*value) : Json(nullptr); }

Json parameter(const network::FittedParameter& p) {
  return {{"value", p.value},    {"unit", p.unit},        {"stderr", known(p.standard_error)},
          {"low", known(p.low)}, {"high", known(p.high)}, {"identified", p.identified},
          {"verdict", p.verdict}};
}

Json estimates(const std::vector<network::Estimate>& list) {
  Json array = Json::array();
  for (const network::Estimate& estimate : list) {
    array.push_back({{"value", estimate.value}, {"stderr", estimate.standard_error}});
  }
  return array;
}

Json model(const network::RankedModel& ranked) {
  const network::ModelFit& fit = ranked.fit;
  Json parameters = Json::object();
  for (const network::FittedParameter& p : fit.parameters) parameters[p.name] = parameter(p);
  const std::size_t n = fit.parameters.size();
  Json covariance = Json::array();
  for (std::size_t a = 0; a < n; ++a) {
    Json row = Json::array();
    for (std::size_t b = 0; b < n; ++b) row.push_back(known(fit.covariance[a * n + b]));
    covariance.push_back(std::move(row));
  }
  const network::ModelInsight& insight = ranked.insight;
  return {{"name", fit.name},
          {"meaning", fit.meaning},
          {"converged", true},
          {"parameters", parameters},
          {"covariance", covariance},
          {"aicc", known(fit.aicc)},
          {"weight", fit.weight},
          {"fitted_to", fit.all_points ? "all samples" : "samples at the outlet"},
          {"rmse", fit.rmse},
          {"scatter_over_stated_error", known(fit.residual_deviation)},
          {"degrees_of_freedom", fit.degrees_of_freedom},
          {"starts_agreeing", fit.starts_agreeing},
          {"starts_tried", fit.starts_tried},
          {"mean_residence_d", insight.mean},
          {"variance_d2", insight.variance},
          {"t10_d", insight.t10},
          {"t50_d", insight.t50},
          {"t90_d", insight.t90},
          {"bypass_fraction", insight.bypass},
          {"first_order_left", estimates(insight.left)},
          {"second_order_left_segregated", insight.left_segregated},
          {"second_order_left_maximum_mixed", insight.left_maximum_mixed},
          {"younger", estimates(insight.younger)},
          {"residual_tests", fit.tests.words},
          {"remarks", fit.remarks}};
}

void add_moments(const network::PointResult& point, Json& summary) {
  if (!point.moments) {
    summary["moments_missing"] = point.reason;
    return;
  }
  const network::TracerMoments& m = *point.moments;
  summary["recovery"] = m.recovery;
  summary["hrt_d"] = m.hydraulic_retention_time;
  summary["mean_residence_d"] = m.mean;
  summary["variance_d2"] = m.variance;
  summary["active_fraction"] = m.active_fraction;
  summary["t10_d"] = m.t10;
  summary["t50_d"] = m.t50;
  summary["t90_d"] = m.t90;
  summary["morrill"] = m.morrill > 0.0 ? Json(m.morrill) : Json(nullptr);
  summary["baffling_factor"] = m.baffling;
  summary["tail_fraction"] = m.tail.share;
  summary["tail"] = m.tail.note;
  summary["integration_rule"] = network::rule_name(m.curve.rule());
  summary["stderr"] = {{"recovery", m.errors.recovery},
                       {"mean_residence_d", m.errors.mean},
                       {"variance_d2", m.errors.variance},
                       {"t10_d", m.errors.t10},
                       {"t50_d", m.errors.t50},
                       {"t90_d", m.errors.t90}};
  summary["verdict"] = m.verdict;
}

}  // namespace

core::Json tracer_summary(const network::TracerTest& test, const network::TracerAnalysis& analysis,
                          const std::vector<std::string>& warnings) {
  Json summary = {{"kind", "tracer"}, {"title", test.title}};
  add_moments(analysis.points[analysis.outlet], summary);
  if (!summary.contains("hrt_d")) summary["hrt_d"] = test.volume.value() / test.mean_flow.value();
  Json points = Json::array();
  for (std::size_t i = 0; i < analysis.points.size(); ++i) {
    Json point = {{"at", analysis.points[i].at},
                  {"samples", test.points[i].samples.size()},
                  {"csv", test.points[i].csv}};
    add_moments(analysis.points[i], point);
    points.push_back(std::move(point));
  }
  summary["points"] = points;
  summary["models"] = Json::array();
  for (const auto& ranked : analysis.models) summary["models"].push_back(model(ranked));
  for (const auto& failed : analysis.failed) {
    summary["models"].push_back(
        {{"name", failed.name}, {"converged", false}, {"reason", failed.reason}});
  }
  Json conversion = Json::array();
  for (const network::ConversionRow& row : analysis.conversion) {
    conversion.push_back({{"rate_1_d", row.rate},
                          {"ideal_tank", row.ideal_tank},
                          {"plug_flow", row.plug_flow},
                          {"data", known(row.data)},
                          {"second_order_ideal_tank", row.ideal_second_order},
                          {"second_order_data_segregated", known(row.data_segregated)},
                          {"second_order_data_maximum_mixed", known(row.data_maximum_mixed)}});
  }
  summary["left_of_decay"] = conversion;
  Json young = Json::array();
  for (const network::YoungRow& row : analysis.young) {
    young.push_back(
        {{"age_d", row.age}, {"ideal_tank", row.ideal_tank}, {"data", known(row.data)}});
  }
  summary["younger_than"] = young;
  summary["cannot_tell"] = analysis.cannot_tell;
  summary["warnings"] = warnings;
  return summary;
}

}  // namespace stillzone::cli
