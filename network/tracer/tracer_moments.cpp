#include "network/tracer/tracer_moments.hpp"

#include <fmt/format.h>

#include <algorithm>
#include <array>
#include <cmath>
#include <optional>
#include <random>
#include <utility>

#include "network/tracer/exponential_tail.hpp"
#include "network/tracer/net_curve.hpp"
#include "network/tracer/pulse_nodes.hpp"
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

/// A curve ready to be integrated, and what was assumed on the way.
struct ReadyCurve {
  std::vector<double> age;
  std::vector<double> height;
  TracerTail tail;
  double step_level = 0.0;  ///< [g/m3] of a step test
  bool plateau_reached = true;
};

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

struct Evaluated {
  TracerTail tail;
  double recovery = 0.0;
  double area = 0.0;
  double mean = 0.0;
  double variance = 0.0;  ///< may be below zero here
  double t10 = 0.0;
  double t50 = 0.0;
  double t90 = 0.0;
  bool plateau_reached = true;
  ResidenceCurve curve;
};

/// Length [d] of age that the dose took.
double dose_length(const TracerTest& test) {
  const auto* pulse = std::get_if<PulseDose>(&test.dose);
  if (pulse == nullptr) return 0.0;
  return test.turnovers(test.dose_at + pulse->duration) * test.volume.value() /
         test.mean_flow.value();
}

/// The numbers of one net curve, or why there are none.
core::Result<Evaluated> evaluate(const TracerTest& test, const NetCurve& measured,
                                 IntegrationRule rule) {
  const auto* pulse = std::get_if<PulseDose>(&test.dose);
  ReadyCurve ready = pulse != nullptr ? ready_pulse(measured, rule) : ready_step(measured, test);
  if (pulse == nullptr) rule = IntegrationRule::straight_lines;
  if (pulse == nullptr && !(ready.step_level > 0.0)) {
    return core::Failure{.reason = "the last samples of the step do not lie above the background"};
  }
  if (rule == IntegrationRule::equal_step_sum && !equally_spaced(ready.age)) {
    return core::Failure{
        .reason = "the equal-step sum needs equal steps from the dose on, counted in turnovers"};
  }
  const double length = dose_length(test);
  ResidenceCurve curve(std::move(ready.age), std::move(ready.height), rule);
  const auto quantile = [&](double share) {
    return std::max(curve.quantile(share) - 0.5 * length, 0.0);
  };
  Evaluated numbers{
      .tail = std::move(ready.tail),
      // Mass out = integral of Q C dt = mean flow x area, for a record too: age counts its water.
      .recovery = pulse != nullptr ? curve.area() * test.mean_flow.value() / pulse->mass
                                   : ready.step_level / std::get<StepDose>(test.dose).concentration,
      .area = curve.area(),
      .mean = curve.mean() - 0.5 * length,
      .variance = curve.variance() - length * length / 12.0,
      .t10 = quantile(0.1),
      .t50 = quantile(0.5),
      .t90 = quantile(0.9),
      .plateau_reached = ready.plateau_reached,
      .curve = curve,
  };
  if (numbers.tail.rate > 0.0) {
    numbers.tail.share = std::max(1.0 - curve.cumulative_at(measured.age.back()), 0.0);
  }
  return numbers;
}

/// Mean and mean square as they come.
class Scatter {
 public:
  void add(double x) {
    ++n_;
    const double step = x - mean_;
    mean_ += step / n_;
    square_ += step * (x - mean_);
  }
  [[nodiscard]] double deviation() const { return n_ > 1 ? std::sqrt(square_ / (n_ - 1)) : 0.0; }

 private:
  int n_ = 0;
  double mean_ = 0.0;
  double square_ = 0.0;
};

/// The samples again and again with their errors laid on once more, those under the limit anywhere
/// below it: how far the numbers scatter. The seed is fixed, so that a test always reads the same.
MomentErrors moment_errors(const TracerTest& test, const NetCurve& measured, IntegrationRule rule) {
  constexpr int kDraws = 200;  // a standard deviation is then known to 5 %
  std::mt19937_64 random(1);
  std::normal_distribution<double> normal;
  std::uniform_real_distribution<double> uniform(0.0, 1.0);
  std::array<Scatter, 6> scatter;
  MomentErrors errors;
  for (int draw = 0; draw < kDraws; ++draw) {
    NetCurve drawn = measured;
    for (std::size_t i = 0; i < drawn.size(); ++i) {
      if (!drawn.censored(i)) drawn.height[i] += drawn.error[i] * normal(random);
      if (drawn.censored(i) && drawn.height[i] > 0.0) {
        drawn.height[i] = drawn.room[i] * uniform(random);
      }
    }
    if (!unusable(drawn).empty()) continue;
    const auto evaluated = evaluate(test, drawn, rule);
    if (!evaluated.ok()) continue;
    const Evaluated& numbers = evaluated.value();
    ++errors.n_draws;
    const std::array<double, 6> all = {numbers.recovery, numbers.mean, numbers.variance,
                                       numbers.t10,      numbers.t50,  numbers.t90};
    for (std::size_t k = 0; k < all.size(); ++k) scatter[k].add(all[k]);
  }
  errors.recovery = scatter[0].deviation();
  errors.mean = scatter[1].deviation();
  errors.variance = scatter[2].deviation();
  errors.t10 = scatter[3].deviation();
  errors.t50 = scatter[4].deviation();
  errors.t90 = scatter[5].deviation();
  return errors;
}

}  // namespace

core::Result<TracerMoments> tracer_moments(const TracerTest& test, const SamplingPoint& point,
                                           IntegrationRule rule) {
  const double tau = test.volume.value() / test.mean_flow.value();
  const NetCurve measured = net_curve(test, point, {});
  if (const std::string reason = unusable(measured); !reason.empty()) {
    return too_little(point, reason);
  }
  auto evaluated = evaluate(test, measured, rule);
  if (!evaluated.ok()) return too_little(point, evaluated.failure().reason);
  Evaluated& numbers = evaluated.value();
  TracerMoments moments{
      .hydraulic_retention_time = tau,
      .recovery = numbers.recovery,
      .area = numbers.area,
      .mean = numbers.mean,
      .variance = std::max(numbers.variance, 0.0),
      .active_fraction = numbers.mean / tau,
      .t10 = numbers.t10,
      .t50 = numbers.t50,
      .t90 = numbers.t90,
      .baffling = numbers.t10 / tau,
      .tail = std::move(numbers.tail),
      .curve = numbers.curve,
      .errors = moment_errors(test, measured, rule),
      .verdict = {},
  };
  moments.before_first_sample = std::max(moments.curve.cumulative_at(measured.age.front()), 0.0);
  constexpr double kNoTime = 1e-3;  // of V/Q: t90/t10 is then in the thousands and says nothing
  moments.morrill = moments.t10 > kNoTime * tau ? moments.t90 / moments.t10 : 0.0;
  VerdictEvidence evidence{.test = test,
                           .measured = measured,
                           .dose_length = dose_length(test),
                           .plateau_reached = numbers.plateau_reached,
                           .variance_was_below_zero = numbers.variance < 0.0};
  const auto is_censored = [](double room) { return room >= 0.0; };
  if (std::holds_alternative<PulseDose>(test.dose) &&
      std::any_of(measured.room.begin(), measured.room.end(), is_censored)) {
    evidence.mean_low = mean_with(test, point, 0.0);
    evidence.mean_high = mean_with(test, point, 1.0);
  }
  moments.verdict = tracer_verdict(moments, evidence);
  return moments;
}

}  // namespace stillzone::network
