#include "network/tracer/tracer_verdict.hpp"

#include <fmt/format.h>

#include <algorithm>
#include <array>
#include <cctype>
#include <cmath>
#include <utility>

namespace stillzone::network {
namespace {

enum class Weight { spoils, grave, minor, fine };

/// Sentences with their weight, in the order they were found.
class Sentences {
 public:
  void add(Weight weight, std::string sentence) {
    sentences_.emplace_back(weight, std::move(sentence));
  }
  [[nodiscard]] std::vector<std::string> gravest_first() && {
    std::stable_sort(sentences_.begin(), sentences_.end(),
                     [](const auto& a, const auto& b) { return a.first < b.first; });
    std::vector<std::string> ordered;
    for (auto& [weight, sentence] : sentences_) ordered.push_back(std::move(sentence));
    return ordered;
  }

 private:
  std::vector<std::pair<Weight, std::string>> sentences_;
};

bool is_lithium(const std::string& tracer) {
  std::string name;
  for (const char c : tracer) {
    name += static_cast<char>(std::tolower(static_cast<unsigned char>(c)));
  }
  return name.find("lithium") != std::string::npos || name == "li" || name == "li+" ||
         name.find("licl") != std::string::npos;
}

/// A recovery that is just the share of lithium in a salt, or its inverse: what was weighed was the
/// salt, or what was stated was.
/// Source: abridged atomic masses Li 6.94, Cl 35.45, C 12.011, O 15.999 (IUPAC, 2021).
std::string salt_hint(double recovery) {
  struct Salt {
    const char* name;
    double lithium;
  };
  static constexpr std::array<Salt, 2> kSalts = {{
      {"lithium chloride LiCl", 6.94 / (6.94 + 35.45)},
      {"lithium carbonate Li2CO3", 2.0 * 6.94 / (2.0 * 6.94 + 12.011 + 3.0 * 15.999)},
  }};
  constexpr double kNear = 1.12;  // between the two salts lie 15 %
  for (const Salt& salt : kSalts) {
    const double off = recovery / salt.lithium;
    if (off < kNear && off > 1.0 / kNear) {
      return fmt::format(
          " It is close to the {:.1f} % of lithium in {}: was the dose stated as salt and measured "
          "as metal?",
          100.0 * salt.lithium, salt.name);
    }
    if (off * salt.lithium * salt.lithium < kNear &&
        off * salt.lithium * salt.lithium > 1.0 / kNear) {
      return fmt::format(
          " It is close to what {} weighs over its lithium ({:.2f}): were the samples stated as "
          "salt, or the dose as metal where salt was weighed?",
          salt.name, 1.0 / salt.lithium);
    }
  }
  return {};
}

void judge_recovery(const TracerMoments& moments, const TracerTest& test, Sentences& sentences) {
  const double recovery = moments.recovery;
  if (!test.conservative) {
    sentences.add(Weight::minor,
                  "The tracer is stated as not conservative: what it loses in the tank lowers "
                  "recovery and mean beside what mixing does.");
  }
  const std::string salt = is_lithium(test.tracer) ? salt_hint(recovery) : std::string();
  // 85 to 115 %: common practice, no source.
  if (recovery >= 0.85 && recovery <= 1.15) {
    sentences.add(Weight::fine,
                  fmt::format("Recovery {:.0f} % lies within 85 to 115 % (common practice, no "
                              "source).",
                              100.0 * recovery));
    return;
  }
  if (recovery < 0.05 || recovery > 8.0) {
    sentences.add(Weight::spoils,
                  fmt::format("Recovery {:.3g} % is off by a factor: check the units of the dose, "
                              "of the value column, of the flow and of the volume.",
                              100.0 * recovery) +
                      salt);
    return;
  }
  if (recovery < 0.85) {
    sentences.add(
        Weight::grave,
        fmt::format("Recovery {:.0f} % is low: usually the test ended before the tail was out, "
                    "tracer settled or was adsorbed, a second outlet was not sampled, or the flow "
                    "was read too low. Check the flow meter, the other outlets and the dose weight "
                    "(salt or metal?), and compare the fits with recovery free.",
                    100.0 * recovery) +
            salt);
    return;
  }
  sentences.add(Weight::grave,
                fmt::format("Recovery {:.0f} % is more than was dosed: usually the background is "
                            "set too low, the flow is read too high, the dose is under-stated, or "
                            "the peak was caught by too few samples. Check the dose weight (salt "
                            "or metal?), the background and the flow meter.",
                            100.0 * recovery) +
                    salt);
}

void judge_tail(const TracerMoments& moments, const VerdictEvidence& evidence,
                Sentences& sentences) {
  const TracerTail& tail = moments.tail;
  if (tail.share > 0.2) {
    sentences.add(Weight::grave,
                  fmt::format("{:.0f} % of the tracer is extrapolated beyond the last sample: mean "
                              "and variance rest on the fitted tail. Sample longer next time.",
                              100.0 * tail.share));
  } else if (tail.share > 0.1) {
    sentences.add(Weight::minor,
                  fmt::format("t90 lies beyond the last sample: {:.0f} % of the tracer is "
                              "extrapolated.",
                              100.0 * tail.share));
  }
  if (tail.share > 0.05 && tail.rate_error > 0.3 * tail.rate) {
    sentences.add(Weight::grave,
                  fmt::format("The rate of the tail is known to {:.0f} % only: so badly known are "
                              "the tracer beyond the last sample and, still more, the variance.",
                              100.0 * tail.rate_error / tail.rate));
  }
  const NetCurve& measured = evidence.measured;
  const std::size_t peak = measured.peak();
  const bool is_pulse = std::holds_alternative<PulseDose>(evidence.test.dose);
  if (is_pulse && tail.rate <= 0.0 && peak < measured.size() &&
      measured.height.back() > 0.05 * measured.height[peak]) {
    sentences.add(Weight::grave,
                  fmt::format("The test ended at {:.0f} % of the peak and no tail could be fitted: "
                              "recovery, mean and variance are too low.",
                              100.0 * measured.height.back() / measured.height[peak]));
  }
  if (!evidence.plateau_reached) {
    sentences.add(
        Weight::grave,
        "The last samples of the step still rise and do not tell where to: recovery, mean "
        "and variance are too low. Sample longer next time.");
  }
}

void judge_limits(const TracerMoments& moments, const VerdictEvidence& evidence,
                  Sentences& sentences) {
  const NetCurve& measured = evidence.measured;
  std::size_t n_censored = 0;
  std::size_t n_below = 0;
  for (std::size_t i = 0; i < measured.size(); ++i) {
    n_censored += measured.censored(i) ? 1U : 0U;
    n_below += !measured.censored(i) && measured.height[i] < -2.0 * measured.error[i] ? 1U : 0U;
  }
  if (3 * n_censored > measured.size()) {
    sentences.add(Weight::minor,
                  fmt::format("{} of {} samples lie under the detection limit: a larger dose would "
                              "have told more.",
                              n_censored, measured.size()));
  }
  if (evidence.mean_low && evidence.mean_high &&
      *evidence.mean_high - *evidence.mean_low > 0.05 * moments.mean) {
    sentences.add(Weight::grave,
                  fmt::format("Samples under the detection limit may hold nothing or as much as "
                              "their limit: the mean lies between {:.3g} and {:.3g} d.",
                              *evidence.mean_low, *evidence.mean_high));
  }
  // Two errors are passed by chance once in 40 samples on one side.
  if (n_below >= 3 && 10 * n_below > measured.size()) {
    sentences.add(Weight::grave,
                  fmt::format("{} of {} samples lie more than two errors below the background: it "
                              "is set too high, or it drifts.",
                              n_below, measured.size()));
  }
}

/// A rise after the peak that the errors do not explain.
std::optional<std::size_t> second_peak(const NetCurve& measured) {
  constexpr double kErrors = 4.0;
  const std::size_t peak = measured.peak();
  if (peak >= measured.size()) return std::nullopt;
  std::size_t lowest = peak;
  std::optional<std::size_t> second;
  for (std::size_t i = peak + 1; i < measured.size(); ++i) {
    if (measured.censored(i)) continue;
    if (measured.height[i] < measured.height[lowest]) lowest = i;
    const double noise = std::hypot(measured.error[i], measured.error[lowest]);
    if (measured.height[i] - measured.height[lowest] > kErrors * noise &&
        (!second || measured.height[i] > measured.height[*second])) {
      second = i;
    }
  }
  return second;
}

void judge_sampling(const TracerMoments& moments, const VerdictEvidence& evidence,
                    Sentences& sentences) {
  const NetCurve& measured = evidence.measured;
  const double first = measured.age.front();
  const double hrt = moments.hydraulic_retention_time;
  if (measured.size() < 10) {  // common practice, no source
    sentences.add(
        Weight::minor,
        fmt::format("Only {} samples: 15 to 30, most of them early, tell a network from a "
                    "tank (common practice, no source).",
                    measured.size()));
  }
  if (first > 0.1 * hrt) {
    sentences.add(
        Weight::grave,
        fmt::format("The first sample was taken at an age of {:.1f} d, {:.0f} % of V/Q: a "
                    "short circuit that passed before is not seen.",
                    first, 100.0 * first / hrt));
  } else if (moments.before_first_sample > 0.05) {
    sentences.add(Weight::minor,
                  fmt::format("{:.0f} % of the tracer is assumed to have passed before the first "
                              "sample.",
                              100.0 * moments.before_first_sample));
  }
  if (!(moments.morrill > 0.0)) {
    sentences.add(Weight::minor,
                  "t10 is next to 0: a short circuit passed at once, so that t90/t10 (Morrill) has "
                  "no meaning and is left out.");
  } else if (moments.t10 < first) {
    sentences.add(Weight::minor,
                  fmt::format("t10 lies before the first sample: it is at most {:.3g} d, and the "
                              "Morrill index at least {:.3g}.",
                              first, moments.t90 / first));
  }
  const bool is_pulse = std::holds_alternative<PulseDose>(evidence.test.dose);
  if (const auto second = is_pulse ? second_peak(measured) : std::nullopt) {
    sentences.add(
        Weight::minor,
        fmt::format("The curve rises again after its peak, to {:.3g} g/m3 at an age of "
                    "{:.3g} d, by more than the errors explain: two paths, recirculation, "
                    "a second dose or a change of the flow.",
                    measured.height[*second], measured.age[*second]));
  }
  if (evidence.dose_length > 0.1 * moments.mean) {
    sentences.add(
        Weight::minor,
        fmt::format("The dose took {:.2g} d, {:.0f} % of the mean: what happens faster is "
                    "blurred, and t10 is corrected roughly only.",
                    evidence.dose_length, 100.0 * evidence.dose_length / moments.mean));
  }
}

/// What the peak hangs on, and how steady the flow was.
void judge_peak_and_flow(const TracerMoments& moments, const VerdictEvidence& evidence,
                         Sentences& sentences) {
  const NetCurve& measured = evidence.measured;
  const std::size_t peak = measured.peak();
  if (std::holds_alternative<PulseDose>(evidence.test.dose) && peak < measured.size()) {
    const double from = peak > 0 ? measured.age[peak - 1] : 0.0;
    const double until = measured.age[std::min(peak + 1, measured.size() - 1)];
    const double share = 0.5 * (until - from) * measured.height[peak] / moments.area;
    if (share > 0.3) {
      sentences.add(
          Weight::minor,
          fmt::format("{:.0f} % of the tracer hang on the one sample at the peak: recovery "
                      "and t10 are as good as that sample.",
                      100.0 * share));
    }
  }
  if (!evidence.test.flow_record) return;
  const core::Timeline& flow = *evidence.test.flow_record;
  const double last = evidence.test.time_at(measured.age.back() / moments.hydraulic_retention_time);
  double low = flow.value_from(evidence.test.dose_at);
  double high = low;
  for (auto next = flow.next_switch(evidence.test.dose_at); next && *next < last;
       next = flow.next_switch(*next)) {
    low = std::min(low, flow.value_from(*next));
    high = std::max(high, flow.value_from(*next));
  }
  if (high > 1.5 * low) {
    sentences.add(
        Weight::minor,
        fmt::format("The flow went from {:.4g} to {:.4g} m3/d during the test; ages are "
                    "counted in turnovers, which is exact only where the flows inside the "
                    "tank go with the feed. Where mixers drive them, trust the fits of the "
                    "networks more than these numbers.",
                    low, high));
  }
}

void judge_mean(const TracerMoments& moments, const VerdictEvidence& evidence,
                Sentences& sentences) {
  if (moments.active_fraction > 1.1) {
    sentences.add(Weight::grave,
                  fmt::format("The mean residence time is {:.2f} times V/Q, which no steady flow "
                              "can give: the volume is stated too small, the flow too high, or the "
                              "tail is an artefact.",
                              moments.active_fraction));
  } else if (moments.active_fraction < 0.85 && moments.recovery > 0.85 &&
             moments.tail.share < 0.2) {
    sentences.add(Weight::minor,
                  fmt::format("The mean residence time is {:.0f} % of V/Q: the rest of the volume "
                              "is dead, or filled with grit, or trades with the flow more slowly "
                              "than this test could see.",
                              100.0 * moments.active_fraction));
  }
  if (evidence.variance_was_below_zero) {
    sentences.add(Weight::grave,
                  "The variance came out below zero (the dose took too long, or noise below the "
                  "background) and is given as 0.");
  }
}

}  // namespace

std::vector<std::string> tracer_verdict(const TracerMoments& moments,
                                        const VerdictEvidence& evidence) {
  Sentences sentences;
  judge_recovery(moments, evidence.test, sentences);
  judge_tail(moments, evidence, sentences);
  judge_mean(moments, evidence, sentences);
  judge_limits(moments, evidence, sentences);
  judge_sampling(moments, evidence, sentences);
  judge_peak_and_flow(moments, evidence, sentences);
  return std::move(sentences).gravest_first();
}

}  // namespace stillzone::network
