#include "network/tracer/tracer_moments.hpp"

#include <fmt/format.h>

#include <algorithm>
#include <cmath>
#include <optional>
#include <utility>

namespace stillzone::network {
namespace {

/// The net curve in days of age: what the tracer added, over the time since the dose.
struct NetCurve {
  std::vector<double> age;     ///< [d] turnovers x V/Q
  std::vector<double> height;  ///< [g/m3] background taken off; censored values at half the limit
  std::vector<double> error;   ///< [g/m3]
  std::vector<bool> censored;
};

NetCurve net_curve(const TracerTest& test, const SamplingPoint& point, double tau) {
  NetCurve curve;
  for (const TracerSample& sample : point.samples) {
    const double age = test.turnovers(sample.time) * tau;
    if (age < 0.0) continue;
    const double background =
        test.background.level + test.background.slope * (sample.time - test.dose_at);
    const double value = sample.censored ? 0.5 * sample.value : sample.value;
    curve.age.push_back(age);
    curve.height.push_back(value - background);
    curve.error.push_back(sample.error);
    curve.censored.push_back(sample.censored);
  }
  return curve;
}

/// Straight line through (age, ln height) of the last falling, quantified samples.
struct TailFit {
  double rate = 0.0;    ///< [1/d]
  double height = 0.0;  ///< [g/m3] of the line at the last sample
  std::size_t n_samples = 0;
};

std::optional<TailFit> fit_tail(const NetCurve& curve) {
  constexpr std::size_t kFewest = 3;
  constexpr std::size_t kMost = 6;
  std::vector<std::pair<double, double>> points;
  const double peak = *std::max_element(curve.height.begin(), curve.height.end());
  for (std::size_t i = curve.age.size(); i-- > 0 && points.size() < kMost;) {
    if (curve.height[i] >= peak) break;  // only what comes after the peak
    if (curve.censored[i] || curve.height[i] <= 2.0 * curve.error[i]) continue;
    points.emplace_back(curve.age[i], std::log(curve.height[i]));
  }
  if (points.size() < kFewest) return std::nullopt;
  double mean_age = 0.0;
  double mean_log = 0.0;
  for (const auto& [age, log_height] : points) {
    mean_age += age / static_cast<double>(points.size());
    mean_log += log_height / static_cast<double>(points.size());
  }
  double product = 0.0;
  double square = 0.0;
  for (const auto& [age, log_height] : points) {
    product += (age - mean_age) * (log_height - mean_log);
    square += (age - mean_age) * (age - mean_age);
  }
  const double rate = square > 0.0 ? -product / square : 0.0;
  if (!(rate > 0.0)) return std::nullopt;
  return TailFit{.rate = rate,
                 .height = std::exp(mean_log - rate * (curve.age.back() - mean_age)),
                 .n_samples = points.size()};
}

/// Adds nodes along the fitted exponential until next to nothing is left under it.
void append_tail(const TailFit& fit, NetCurve& curve) {
  constexpr int kNodes = 160;
  constexpr double kDecades = 14.0;  // in natural logs: e^-14 of the tail is left out
  const double start = curve.age.back();
  curve.height.back() = fit.height;
  for (int k = 1; k <= kNodes; ++k) {
    const double x = kDecades * k / kNodes;
    curve.age.push_back(start + x / fit.rate);
    curve.height.push_back(fit.height * std::exp(-x));
  }
}

/// A curve that starts after the dose is taken back to it at the height of its first sample.
void extend_to_dose(NetCurve& curve) {
  if (curve.age.front() <= 0.0) return;
  std::vector<double> age = {0.0};
  std::vector<double> height = {curve.height.front()};
  for (std::size_t i = 0; i < curve.age.size(); ++i) {
    age.push_back(curve.age[i]);
    height.push_back(curve.height[i]);
  }
  curve.age.swap(age);
  curve.height.swap(height);
}

/// A step test gives F; its slope between samples is the density, at mid-interval.
NetCurve density_of_step(const NetCurve& step, double plateau) {
  NetCurve density;
  double previous_age = 0.0;
  double previous = 0.0;
  for (std::size_t i = 0; i < step.age.size(); ++i) {
    const double width = step.age[i] - previous_age;
    if (width <= 0.0) continue;
    density.age.push_back(0.5 * (step.age[i] + previous_age));
    density.height.push_back((step.height[i] - previous) / (plateau * width));
    density.error.push_back(step.error[i] / (plateau * width));
    density.censored.push_back(false);
    previous_age = step.age[i];
    previous = step.height[i];
  }
  return density;
}

std::string recovery_verdict(double recovery) {
  // 85 to 115 %: common practice, no source.
  if (recovery < 0.85) {
    return fmt::format(
        "Recovery {:.0f} % is low: usually the test ended before the tail was out, tracer settled "
        "or "
        "was adsorbed, a second outlet was not sampled, or the flow was read too low. Check the "
        "flow meter and the other outlets, and compare the fits with recovery free.",
        100.0 * recovery);
  }
  if (recovery > 1.15) {
    return fmt::format(
        "Recovery {:.0f} % is more than was dosed: usually the background is set too low, the flow "
        "is read too high, the dose is under-stated, or a short circuit passed between two "
        "samples. "
        "Check the dose weight (salt or metal?), the background and the flow meter.",
        100.0 * recovery);
  }
  return fmt::format("Recovery {:.0f} % lies within 85 to 115 % (common practice, no source).",
                     100.0 * recovery);
}

std::vector<std::string> verdict_on(const TracerMoments& moments, const NetCurve& measured,
                                    bool extended) {
  std::vector<std::string> verdict;
  verdict.push_back(recovery_verdict(moments.recovery));
  if (moments.tail.share > 0.2) {
    verdict.push_back(
        fmt::format("{:.0f} % of the tracer is extrapolated beyond the last sample: mean and "
                    "variance rest on the fitted tail. Sample longer next time.",
                    100.0 * moments.tail.share));
  }
  const auto n_censored = std::count(measured.censored.begin(), measured.censored.end(), true);
  if (3 * n_censored > static_cast<long>(measured.censored.size())) {
    verdict.push_back(
        fmt::format("{} of {} samples lie under the detection limit: a larger dose "
                    "would have told more.",
                    n_censored, measured.censored.size()));
  }
  if (extended && measured.age.front() > 0.1 * moments.hydraulic_retention_time) {
    verdict.push_back(
        fmt::format("The first sample was taken {:.1f} d after the dose: a short circuit that "
                    "passed before is not seen.",
                    measured.age.front()));
  }
  if (moments.active_fraction > 1.1) {
    verdict.push_back(fmt::format(
        "The mean residence time is {:.2f} times V/Q, which no steady flow can give: the "
        "volume is stated too small, the flow too high, or the tail is an artefact.",
        moments.active_fraction));
  }
  return verdict;
}

core::Failure too_little(const SamplingPoint& point, const std::string& reason) {
  return {.reason = fmt::format("{}: {}", point.csv, reason),
          .place = point.at,
          .try_this = "Check the columns, the units and the time of the dose."};
}

}  // namespace

core::Result<TracerMoments> tracer_moments(const TracerTest& test, const SamplingPoint& point,
                                           IntegrationRule rule) {
  const double tau = test.volume.value() / test.mean_flow.value();
  const NetCurve measured = net_curve(test, point, tau);
  if (measured.age.size() < 4) {
    return too_little(point, fmt::format("{} usable samples after the dose; at least 4 are needed",
                                         measured.age.size()));
  }
  if (*std::max_element(measured.height.begin(), measured.height.end()) <= 0.0) {
    return too_little(point, "no sample rises above the background");
  }
  const auto* pulse = std::get_if<PulseDose>(&test.dose);
  NetCurve curve = measured;
  double recovery = 0.0;
  if (pulse == nullptr) {
    const double plateau = measured.height.back();
    recovery = plateau / std::get<StepDose>(test.dose).concentration;
    curve = density_of_step(measured, plateau);
  }
  TracerTail tail;
  const auto fitted = fit_tail(curve);
  const std::size_t n_measured = curve.age.size();
  // Equal steps cannot go on into a tail of other steps.
  if (fitted && rule != IntegrationRule::equal_step_sum && pulse != nullptr) {
    append_tail(*fitted, curve);
    tail.rate = fitted->rate;
    tail.note = fmt::format("exponential of {:.4g} 1/d through the last {} quantified samples",
                            fitted->rate, fitted->n_samples);
  } else if (pulse == nullptr) {
    tail.note = "a step test is taken as complete at its last sample";
  } else {
    tail.note = fitted ? "none: the equal-step sum stops at the last sample"
                       : "none: fewer than 3 falling, quantified samples after the peak";
  }
  extend_to_dose(curve);
  ResidenceCurve residence(curve.age, curve.height, rule);
  if (pulse != nullptr) recovery = residence.area() * test.mean_flow.value() / pulse->mass;
  const double dose_length =
      pulse != nullptr ? (test.turnovers(test.dose_at + pulse->duration)) * tau : 0.0;
  TracerMoments moments{
      .hydraulic_retention_time = tau,
      .recovery = recovery,
      .area = residence.area(),
      .mean = residence.mean() - 0.5 * dose_length,
      .variance = residence.variance() - dose_length * dose_length / 12.0,
      .active_fraction = 0.0,
      .t10 = residence.quantile(0.1),
      .t50 = residence.quantile(0.5),
      .t90 = residence.quantile(0.9),
      .morrill = 0.0,
      .baffling = 0.0,
      .tail = tail,
      .curve = residence,
      .verdict = {},
  };
  if (tail.rate > 0.0) moments.tail.share = 1.0 - residence.cumulative_at(measured.age.back());
  moments.active_fraction = moments.mean / tau;
  moments.morrill = moments.t90 / moments.t10;
  moments.baffling = moments.t10 / tau;
  moments.verdict = verdict_on(moments, measured, curve.age.size() > n_measured);
  return moments;
}

}  // namespace stillzone::network
