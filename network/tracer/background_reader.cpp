#include "network/tracer/background_reader.hpp"

#include <fmt/format.h>

#include <cmath>
#include <vector>

namespace stillzone::network {
namespace {

using core::Measure;
using core::ObjectReader;
using Need = ObjectReader::Need;

/// Slope [g/m3/d] of the quantified samples before the dose over its standard error, 0 when nothing
/// can be said (fewer than 4, or all at once).
double slope_significance(const std::vector<TracerSample>& before) {
  double w = 0.0;
  double wt = 0.0;
  double wv = 0.0;
  std::size_t n = 0;
  for (const TracerSample& s : before) {
    if (s.censored) continue;
    const double weight = 1.0 / (s.error * s.error);
    w += weight;
    wt += weight * s.time;
    wv += weight * s.value;
    ++n;
  }
  if (n < 4) return 0.0;
  double tt = 0.0;
  double tv = 0.0;
  for (const TracerSample& s : before) {
    if (s.censored) continue;
    const double weight = 1.0 / (s.error * s.error);
    tt += weight * (s.time - wt / w) * (s.time - wt / w);
    tv += weight * (s.time - wt / w) * (s.value - wv / w);
  }
  return tt > 0.0 ? tv / std::sqrt(tt) : 0.0;
}

}  // namespace

void read_background(ObjectReader& reader, TracerTest& test) {
  const core::Json* node = reader.raw("background");
  if (node == nullptr) {
    test.background.how = "none stated, taken as 0";
    return;
  }
  if (node->is_string()) {
    const std::string text = node->get<std::string>();
    if (text == "before dose") {
      test.background.how = text;
      return;
    }
    if (text.find_first_of("0123456789") == std::string::npos) {
      reader.fault("background", core::shown(*node),
                   "a background is a concentration, \"before dose\" or {\"at_dose\": .., "
                   "\"later\": .., \"after\": ..}",
                   "Write \"before dose\" to take the mean of the samples before the dose.");
      return;
    }
  }
  const auto limit = ObjectReader::not_negative(Measure::concentration);
  if (!node->is_object() || node->contains("value")) {
    const auto level = reader.quantity<Measure::concentration>("background", Need::required, limit);
    if (level) test.background.level = 1000.0 * level->value();
    test.background.how = "as stated";
    return;
  }
  auto drift = reader.object("background", Need::required);
  if (!drift) return;
  const auto start = drift->quantity<Measure::concentration>("at_dose", Need::required, limit);
  const auto end = drift->quantity<Measure::concentration>("later", Need::required, limit);
  const auto after = drift->quantity<Measure::duration>("after", Need::required,
                                                        ObjectReader::positive(Measure::duration));
  drift->finish();
  if (!start || !end || !after) return;
  test.background.level = 1000.0 * start->value();
  test.background.slope = 1000.0 * (end->value() - start->value()) / after->value();
  test.background.how = fmt::format("drifting, as stated: {:.3g} to {:.3g} g/m3 in {:.3g} d",
                                    1000.0 * start->value(), 1000.0 * end->value(), after->value());
}

void background_from_samples(ObjectReader& reader, TracerTest& test) {
  if (test.background.how != "before dose") return;
  double sum = 0.0;
  std::size_t n = 0;
  std::size_t n_censored = 0;
  for (const SamplingPoint& point : test.points) {
    for (const TracerSample& sample : point.before) {
      sum += sample.censored ? 0.5 * sample.value : sample.value;
      n_censored += sample.censored ? 1U : 0U;
      ++n;
    }
    if (std::abs(slope_significance(point.before)) > 3.0) {
      test.notes.push_back(
          point.csv +
          ": the samples before the dose drift; their mean is taken. If the drift went on, state "
          "\"background\": {\"at_dose\": .., \"later\": .., \"after\": ..}");
    }
  }
  if (n == 0) {
    reader.fault("background", "\"before dose\"", "no sample was taken before the dose",
                 "State the background as a concentration, or add the earlier samples.");
    return;
  }
  test.background.level = sum / static_cast<double>(n);
  test.background.how =
      fmt::format("mean of {} sample{} before the dose", n, n == 1 ? "" : "s") +
      (n_censored > 0
           ? fmt::format(", {} of them under the limit and counted at half of it", n_censored)
           : "");
}

}  // namespace stillzone::network
