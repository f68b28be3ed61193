#include "network/tracer/tracer_moments.hpp"

#include <fmt/format.h>

#include <algorithm>
#include <cmath>
#include <optional>
#include <utility>

#include "network/tracer/exponential_tail.hpp"
#include "network/tracer/net_curve.hpp"
#include "network/tracer/step_response.hpp"
#include "network/tracer/tracer_verdict.hpp"

namespace stillzone::network {
namespace {

core::Failure too_little(const SamplingPoint& point, const std::string& reason) {
  return {.reason = fmt::format("{}: {}", point.csv, reason),
          .place = point.at,
          .try_this = "Check the columns, the units and the time of the dose."};
}

/// Why no curve can be made of the samples; empty when it can.
std::string unusable(const NetCurve& measured) {
  if (measured.size() < 4) {
    return fmt::format("{} usable samples after the dose; at least 4 are needed", measured.size());
  }
  const std::size_t peak = measured.peak();
  if (peak >= measured.size()) return "every sample lies under its detection limit";
  if (measured.height[peak] <= 2.0 * measured.error[peak]) {
    return fmt::format(
        "no sample rises above the background by more than two errors (the highest by {:.3g} "
        "g/m3, error {:.3g} g/m3)",
        measured.height[peak], measured.error[peak]);
  }
  double above = 0.0;
  double below = 0.0;
  for (std::size_t i = 1; i < measured.size(); ++i) {
    const double piece = 0.5 * (measured.age[i] - measured.age[i - 1]) *
                         (measured.height[i] + measured.height[i - 1]);
    (piece > 0.0 ? above : below) += std::abs(piece);
  }
  // 4: no integration rule weighs neighbours more unequally, so that the area is > 0 by each.
  if (!(above > 4.0 * below)) {
    return fmt::format(
        "the curve lies as much below the background as above it ({:.3g} against {:.3g} g d/m3)",
        below, above);
  }
  return {};
}

/// Samples with a number from the peak on.
std::vector<FallingPoint> after_peak(const NetCurve& curve) {
  std::vector<FallingPoint> points;
  for (std::size_t i = curve.peak() + 1; i < curve.size(); ++i) {
    if (!curve.censored(i)) points.push_back({curve.age[i], curve.height[i], curve.error[i]});
  }
  return points;
}

/// Nodes of a pulse curve from the dose to where next to nothing is left.
struct PulseNodes {
  std::vector<double> age;
  std::vector<double> height;
};

/// From the dose to the first sample: a curve that rises there started at 0, as behind any delay or
/// second tank; one that falls was level, for how high a short circuit rose nobody saw.
void start_at_dose(const NetCurve& curve, PulseNodes& nodes) {
  if (curve.age.front() <= 0.0) return;
  const double first = curve.height.front();
  const std::size_t last_looked_at = std::min<std::size_t>(3, curve.size() - 1);
  bool rises = first <= 0.0;
  for (std::size_t i = 1; i <= last_looked_at; ++i) {
    rises = rises || curve.height[i] - first > 2.0 * std::hypot(curve.error[i], curve.error[0]);
  }
  nodes.age.push_back(0.0);
  nodes.height.push_back(rises ? 0.0 : first);
}

/// The samples, those under the limit after the last number on the tail (at their limit at most).
PulseNodes pulse_nodes(const NetCurve& curve, const std::optional<ExponentialTail>& tail) {
  PulseNodes nodes;
  start_at_dose(curve, nodes);
  std::size_t last_number = curve.size();
  while (curve.censored(last_number - 1)) --last_number;
  for (std::size_t i = 0; i < curve.size(); ++i) {
    nodes.age.push_back(curve.age[i]);
    const bool on_tail = tail && i >= last_number;
    nodes.height.push_back(on_tail ? std::min(tail->height_at(curve.age[i]), curve.room[i])
                                   : curve.height[i]);
  }
  return nodes;
}

/// Adds nodes along the exponential until next to nothing is left under it.
void append_tail(const ExponentialTail& tail, double start_height, PulseNodes& nodes) {
  constexpr int kNodes = 320;
  constexpr double kLengths = 16.0;  // e^-16 of the tail is left out; the steps add 2e-4 to it
  const double start = nodes.age.back();
  for (int k = 1; k <= kNodes; ++k) {
    const double x = kLengths * k / kNodes;
    nodes.age.push_back(start + x / tail.rate);
    nodes.height.push_back(start_height * std::exp(-x));
  }
}

/// A curve ready to be integrated, and what was assumed on the way.
struct ReadyCurve {
  std::vector<double> age;
  std::vector<double> height;
  TracerTail tail;
  double step_level = 0.0;  ///< [g/m3] of a step test
  bool plateau_reached = true;
};

/// The exponential after the peak, unless the last number lies clearly below it: then the curve has
/// ended, and a tail would be made up.
std::optional<ExponentialTail> believable_tail(const NetCurve& curve) {
  const std::vector<FallingPoint> points = after_peak(curve);
  const auto fitted = fit_exponential_tail(points);
  if (!fitted) return std::nullopt;
  const FallingPoint& last = points.back();
  const bool below = fitted->height - last.height > 3.0 * last.error;
  if (below && last.height < 0.5 * fitted->height) return std::nullopt;
  return fitted;
}

ReadyCurve ready_pulse(const NetCurve& measured, IntegrationRule rule) {
  ReadyCurve ready;
  const auto fitted = believable_tail(measured);
  // Equal steps cannot go on into a tail of other steps.
  const bool wanted = rule != IntegrationRule::equal_step_sum;
  PulseNodes nodes = pulse_nodes(measured, wanted ? fitted : std::nullopt);
  if (fitted && wanted) {
    const double at_last = fitted->height_at(measured.age.back());
    const double start =
        measured.censored(measured.size() - 1) ? std::min(at_last, measured.room.back()) : at_last;
    append_tail(*fitted, start, nodes);
    ready.tail.rate = fitted->rate;
    ready.tail.rate_error = fitted->rate_error;
    ready.tail.note = fmt::format("exponential of {:.4g} +- {:.2g} 1/d through the last {} samples",
                                  fitted->rate, fitted->rate_error, fitted->n_points);
  } else {
    ready.tail.note = fitted
                          ? "none: the equal-step sum stops at the last sample"
                          : "none: the samples after the peak have ended, or tell no rate of decay";
  }
  ready.age = std::move(nodes.age);
  ready.height = std::move(nodes.height);
  return ready;
}

ReadyCurve ready_step(const NetCurve& measured, const TracerTest& test) {
  ReadyCurve ready;
  const StepPlateau plateau = step_plateau(measured);
  ready.step_level = plateau.level;
  ready.plateau_reached = plateau.reached;
  const double level =
      test.recovery_fitted ? plateau.level : std::get<StepDose>(test.dose).concentration;
  std::vector<FallingPoint> missing;
  for (std::size_t i = 0; i < measured.size(); ++i) {
    if (measured.censored(i)) continue;
    missing.push_back({measured.age[i], level - measured.height[i], measured.error[i]});
  }
  const auto fitted = fit_exponential_tail(missing);
  DensityNodes nodes = step_density(measured, level, fitted);
  ready.age = std::move(nodes.age);
  ready.height = std::move(nodes.height);
  ready.tail.note =
      fmt::format("step towards {:.4g} g/m3 ({})", level,
                  test.recovery_fitted ? fmt::format("from the last {} samples", plateau.n_samples)
                                       : "as dosed");
  if (fitted) {
    ready.tail.rate = fitted->rate;
    ready.tail.rate_error = fitted->rate_error;
    ready.tail.note += fmt::format(", the rest by an exponential of {:.4g} +- {:.2g} 1/d",
                                   fitted->rate, fitted->rate_error);
  } else {
    ready.tail.note += ", taken as complete at the last sample";
  }
  return ready;
}

/// Mean [d] with every sample under the limit at a share of its room, those before the first number
/// at 0; none beyond them when they are taken as empty. Empty when no curve comes of it.
std::optional<double> mean_with(const TracerTest& test, const SamplingPoint& point, double share) {
  const NetCurve measured = net_curve(test, point, {.share = share});
  if (!unusable(measured).empty()) return std::nullopt;
  PulseNodes nodes = pulse_nodes(measured, std::nullopt);
  const bool ends_censored = measured.censored(measured.size() - 1);
  const auto fitted = believable_tail(measured);
  if (fitted && !(ends_censored && share <= 0.0)) {
    append_tail(*fitted,
                ends_censored ? measured.height.back() : fitted->height_at(measured.age.back()),
                nodes);
  }
  return ResidenceCurve(nodes.age, nodes.height, IntegrationRule::straight_lines).mean();
}

}  // namespace

core::Result<TracerMoments> tracer_moments(const TracerTest& test, const SamplingPoint& point,
                                           IntegrationRule rule) {
  const double tau = test.volume.value() / test.mean_flow.value();
  const NetCurve measured = net_curve(test, point, {});
  if (const std::string reason = unusable(measured); !reason.empty()) {
    return too_little(point, reason);
  }
  const auto* pulse = std::get_if<PulseDose>(&test.dose);
  ReadyCurve ready = pulse != nullptr ? ready_pulse(measured, rule) : ready_step(measured, test);
  if (pulse == nullptr) rule = IntegrationRule::straight_lines;
  if (rule == IntegrationRule::equal_step_sum && !equally_spaced(ready.age)) {
    return too_little(
        point, "the equal-step sum needs equal steps from the dose on, counted in turnovers");
  }
  const ResidenceCurve residence(std::move(ready.age), std::move(ready.height), rule);
  const double dose_length =
      pulse != nullptr ? test.turnovers(test.dose_at + pulse->duration) * tau : 0.0;
  const auto quantile = [&](double share) {
    return std::max(residence.quantile(share) - 0.5 * dose_length, 0.0);
  };
  const double variance = residence.variance() - dose_length * dose_length / 12.0;
  TracerMoments moments{
      .hydraulic_retention_time = tau,
      // Mass out = integral of Q C dt = mean flow x area, for a record too: age counts its water.
      .recovery = pulse != nullptr ? residence.area() * test.mean_flow.value() / pulse->mass
                                   : ready.step_level / std::get<StepDose>(test.dose).concentration,
      .area = residence.area(),
      .mean = residence.mean() - 0.5 * dose_length,
      .variance = std::max(variance, 0.0),
      .t10 = quantile(0.1),
      .t50 = quantile(0.5),
      .t90 = quantile(0.9),
      .tail = std::move(ready.tail),
      .curve = residence,
      .verdict = {},
  };
  moments.before_first_sample = std::max(residence.cumulative_at(measured.age.front()), 0.0);
  if (moments.tail.rate > 0.0) {
    moments.tail.share = std::max(1.0 - residence.cumulative_at(measured.age.back()), 0.0);
  }
  moments.active_fraction = moments.mean / tau;
  constexpr double kNoTime = 1e-3;  // of V/Q: t90/t10 is then in the thousands and says nothing
  moments.morrill = moments.t10 > kNoTime * tau ? moments.t90 / moments.t10 : 0.0;
  moments.baffling = moments.t10 / tau;
  VerdictEvidence evidence{.test = test,
                           .measured = measured,
                           .dose_length = dose_length,
                           .plateau_reached = ready.plateau_reached,
                           .variance_was_below_zero = variance < 0.0};
  const auto is_censored = [](double room) { return room >= 0.0; };
  if (pulse != nullptr && std::any_of(measured.room.begin(), measured.room.end(), is_censored)) {
    evidence.mean_low = mean_with(test, point, 0.0);
    evidence.mean_high = mean_with(test, point, 1.0);
  }
  moments.verdict = tracer_verdict(moments, evidence);
  return moments;
}

}  // namespace stillzone::network
