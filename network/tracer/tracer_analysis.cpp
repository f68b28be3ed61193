#include "network/tracer/tracer_analysis.hpp"

#include <fmt/format.h>

#include <algorithm>
#include <array>
#include <cmath>
#include <limits>
#include <utility>
#include <variant>

#include "core/require.hpp"
#include "core/side_by_side.hpp"
#include "network/tracer/model_conversion.hpp"

namespace stillzone::network {
namespace {

constexpr double kReportTolerance = 1e-6;

double nominal_days(const TracerTest& test) { return test.volume.value() / test.mean_flow.value(); }

/// Rates around 1/HRT: slow and quick hydrolysis, die-off.
constexpr std::array kRatesTimesRetention = {1.0, 4.0, 20.0};
constexpr std::array kAgesOverRetention = {0.05, 0.1, 0.25, 0.5};

std::vector<PointResult> moments_of(const TracerTest& test, IntegrationRule rule) {
  std::vector<PointResult> results;
  for (const SamplingPoint& point : test.points) {
    PointResult result{.at = point.at, .moments = std::nullopt, .reason = {}};
    if (point.at != "outlet") {
      result.reason = "recovery and residence times are taken at the outlet";
      results.push_back(std::move(result));
      continue;
    }
    auto moments = tracer_moments(test, point, rule);
    if (moments) {
      result.moments = std::move(moments.value());
    } else {
      result.reason = moments.failure().text();
    }
    results.push_back(std::move(result));
  }
  return results;
}

void tabulate_data(double tau, TracerAnalysis& analysis) {
  const double none = std::numeric_limits<double>::quiet_NaN();
  const auto& first = analysis.points[analysis.outlet].moments;
  for (const double k_tau : kRatesTimesRetention) {
    const double k = k_tau / tau;
    ConversionRow row{.rate = k,
                      .ideal_tank = 1.0 / (1.0 + k_tau),
                      .plug_flow = std::exp(-k_tau),
                      .data = none,
                      .data_segregated = none,
                      .data_maximum_mixed = none,
                      .ideal_second_order = 2.0 / (1.0 + std::sqrt(1.0 + 4.0 * k_tau))};
    if (first) {
      row.data = first->curve.first_order_left(k);
      row.data_segregated = first->curve.second_order_segregated(k);
      row.data_maximum_mixed = first->curve.second_order_maximum_mixedness(k);
    }
    analysis.conversion.push_back(row);
  }
  for (const double share : kAgesOverRetention) {
    analysis.young.push_back({.age = share * tau,
                              .ideal_tank = -std::expm1(-share),
                              .data = first ? first->curve.cumulative_at(share * tau) : none});
  }
}

/// sqrt(g' C g) over the model's own parameters.
double error_of(const ModelFit& fit, std::span<const double> gradient) {
  const std::size_t n = fit.parameters.size();
  double variance = 0.0;
  for (std::size_t a = 0; a < gradient.size(); ++a) {
    if (fit.parameters[a].at_bound) continue;
    if (!std::isfinite(fit.parameters[a].standard_error)) return 0.0;
    for (std::size_t b = 0; b < gradient.size(); ++b) {
      variance += gradient[a] * fit.covariance[a * n + b] * gradient[b];
    }
  }
  return std::sqrt(std::max(variance, 0.0));
}

ModelInsight insight_into(const RtdModel& model, const ModelFit& fit, double tau,
                          const TracerAnalysis& analysis) {
  const std::vector<double> p = fit.model_values();
  ModelInsight insight;
  insight.mean = model.mean(p) * tau;
  insight.variance = model.variance(p) * tau * tau;
  insight.t10 = quantile(model, p, 0.1) * tau;
  insight.t50 = quantile(model, p, 0.5) * tau;
  insight.t90 = quantile(model, p, 0.9) * tau;
  for (const RtdImpulse& impulse : model.impulses(p)) {
    if (impulse.theta <= 0.0) insight.bypass += impulse.share;
  }
  std::vector<double> gradient(p.size());
  for (const ConversionRow& row : analysis.conversion) {
    const double k_tau = row.rate * tau;
    const double left = model.transform(p, k_tau, gradient);
    insight.left.push_back({left, error_of(fit, gradient)});
    insight.left_segregated.push_back(second_order_segregated(model, p, k_tau, kReportTolerance));
    insight.left_maximum_mixed.push_back(
        second_order_maximum_mixedness(model, p, k_tau, kReportTolerance));
  }
  for (const YoungRow& row : analysis.young) {
    const double share = model.step_response(p, row.age / tau, gradient);
    insight.younger.push_back({share, error_of(fit, gradient)});
  }
  return insight;
}

void rank(std::vector<RankedModel>& models) {
  std::ranges::stable_sort(
      models, [](const RankedModel& a, const RankedModel& b) { return a.fit.aicc < b.fit.aicc; });
  if (models.empty() || !std::isfinite(models.front().fit.aicc)) return;
  double sum = 0.0;
  for (RankedModel& ranked : models) {
    ranked.fit.weight = std::exp(-0.5 * (ranked.fit.aicc - models.front().fit.aicc));
    sum += ranked.fit.weight;
  }
  for (RankedModel& ranked : models) ranked.fit.weight /= sum;
}

/// What the test leaves open, over all models.
void say_what_is_open(const TracerTest& test, TracerAnalysis& analysis) {
  auto& words = analysis.cannot_tell;
  if (analysis.models.empty()) return;
  const ModelFit& best = analysis.models.front().fit;
  std::string rivals;
  for (std::size_t i = 1; i < analysis.models.size(); ++i) {
    const ModelFit& fit = analysis.models[i].fit;
    if (fit.all_points == best.all_points && fit.aicc - best.aicc < 2.0)
      rivals += (rivals.empty() ? "" : ", ") + fit.name;
  }
  if (!rivals.empty()) {
    words.push_back(fmt::format(
        "Whether {} or {} is the right picture: their criteria differ by less than 2. Where their "
        "answers agree the choice does not matter; where they differ, more samples early and "
        "late would tell.",
        best.name, rivals));
  }
  for (const FittedParameter& p : best.parameters) {
    if (!p.identified) words.push_back(fmt::format("{} of {}: {}.", p.name, best.name, p.verdict));
  }
  if (best.all_points && !analysis.models.back().fit.all_points) {
    words.emplace_back(
        "How our own models compare with your networks: they are fitted to the outlet alone, so "
        "their criteria count other samples.");
  }
  const auto* pulse = std::get_if<PulseDose>(&test.dose);
  if (pulse != nullptr && !(pulse->duration > 0.0)) {
    words.emplace_back(
        "A bypass that leaves faster than the first sample: after a dose at once it shows only as "
        "tracer not recovered. A dose over some hours with samples meanwhile would show it.");
  }
  if (test.recovery_fitted) {
    words.emplace_back(
        "Where the tracer went that was not recovered: with recovery free, a lost share, a bypass "
        "and a flow read wrongly look alike.");
  }
  words.emplace_back(
      "Where in the tank the stagnant volume lies: an outlet curve sees how much is slow, not "
      "where. Samples at several depths, or a probe, would tell.");
  words.emplace_back(
      "Whether solids move as the water does: a dissolved tracer follows the water only.");
}

}  // namespace

TracerAnalysis analyse_tracer_test(const TracerTest& test,
                                   std::vector<std::shared_ptr<const TracerModel>> networks,
                                   const AnalysisOptions& options) {
  const double tau = nominal_days(test);
  TracerAnalysis analysis;
  analysis.points = moments_of(test, options.rule);
  const auto outlet = std::ranges::find(analysis.points, "outlet", &PointResult::at);
  SZ_REQUIRE(outlet != analysis.points.end(), "no point at the outlet");
  analysis.outlet = static_cast<std::size_t>(outlet - analysis.points.begin());
  tabulate_data(tau, analysis);
  std::vector<std::shared_ptr<const TracerModel>> models;
  for (const std::string& name : test.models) models.emplace_back(make_candidate(name, test));
  for (auto& network : networks) models.push_back(std::move(network));

  struct Outcome {
    std::optional<RankedModel> ranked;
    std::string reason;
  };
  std::vector<Outcome> outcomes(models.size());
  core::side_by_side(models.size(), options.threads, [&](std::size_t i) {
    auto fit = fit_model(test, *models[i], {});
    if (!fit) {
      outcomes[i].reason = fit.failure().text();
      return;
    }
    RankedModel ranked{.model = models[i], .fit = std::move(fit.value()), .insight = {}};
    ranked.insight = insight_into(models[i]->residence(), ranked.fit, tau, analysis);
    outcomes[i].ranked = std::move(ranked);
  });
  for (std::size_t i = 0; i < models.size(); ++i) {
    if (outcomes[i].ranked) {
      analysis.models.push_back(std::move(*outcomes[i].ranked));
    } else {
      analysis.failed.push_back({models[i]->name(), outcomes[i].reason});
    }
  }
  rank(analysis.models);
  say_what_is_open(test, analysis);
  return analysis;
}

}  // namespace stillzone::network
