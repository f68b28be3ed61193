#include <fmt/format.h>

#include <algorithm>
#include <array>
#include <cmath>
#include <utility>

#include "core/near_name.hpp"
#include "network/tracer/flow_record_reader.hpp"
#include "network/tracer/rtd_model.hpp"
#include "network/tracer/sample_reader.hpp"
#include "network/tracer/tracer_test.hpp"

namespace stillzone::network {
namespace {

using core::Measure;
using core::ObjectReader;
using Need = ObjectReader::Need;

/// A fault at any pointer of the document.
void fault_at(ObjectReader& reader, const std::string& pointer, std::string found,
              std::string allowed, std::string way_out) {
  const core::JsonDocument& document = reader.context().document;
  reader.context().faults.add({.file = document.name(),
                               .pointer = pointer,
                               .line = document.line_of(pointer),
                               .found = std::move(found),
                               .allowed = std::move(allowed),
                               .way_out = std::move(way_out)});
}

/// "flow": a quantity, or a record.
void read_flow(ObjectReader& reader, const TestClock& clock, TracerTest& test) {
  const core::Json* node = reader.raw("flow");
  if (node == nullptr) {
    reader.fault(
        "", "no \"flow\"", "a test needs the flow through the tank",
        "Add \"flow\": \"150 m3/d\", or a record {\"csv\": .., \"time\": .., \"value\": ..}.");
    return;
  }
  if (!node->is_object() || !(node->contains("csv") || node->contains("time"))) {
    const auto flow = reader.quantity<Measure::flow>("flow", Need::required,
                                                     ObjectReader::positive(Measure::flow));
    if (flow) test.mean_flow = *flow;
    return;
  }
  auto record = reader.object("flow", Need::required);
  if (!record) return;
  test.flow_record = read_flow_record(*record, clock, test.dose_at, test.notes);
  record->finish();
}

/// "dose": {"tracer", "mass", "at", "over", "into"} or {"tracer", "step", "at", "into"}.
void read_dose(ObjectReader& reader, TestClock& clock, TracerTest& test) {
  auto dose = reader.object("dose", Need::required);
  if (!dose) return;
  test.tracer = dose->text("tracer", Need::optional).value_or("tracer");
  test.dose_into = dose->text("into", Need::optional).value_or("feed");
  if (const auto at = clock.read_start(*dose)) test.dose_at = *at;
  const bool has_mass = dose->has("mass");
  const bool has_step = dose->has("step");
  if (has_mass == has_step) {
    dose->fault("", has_mass ? "both \"mass\" and \"step\"" : "neither \"mass\" nor \"step\"",
                "a dose is a mass or a step in the feed",
                "Give \"mass\": \"24 kg\" for a pulse or \"step\": \"3 g/m3\" for a step.");
  }
  if (has_mass) {
    PulseDose pulse;
    const auto mass = dose->quantity<Measure::mass>("mass", Need::required,
                                                    ObjectReader::positive(Measure::mass));
    if (mass) pulse.mass = 1000.0 * mass->value();
    const auto over = dose->quantity<Measure::duration>(
        "over", Need::optional, ObjectReader::not_negative(Measure::duration));
    if (over) pulse.duration = over->value();
    test.dose = pulse;
  } else if (!has_step) {
    (void)dose->raw("mass");
    (void)dose->raw("step");
    (void)dose->raw("over");
  }
  if (has_step) {
    const auto step = dose->quantity<Measure::concentration>(
        "step", Need::required, ObjectReader::positive(Measure::concentration));
    test.dose = StepDose{step ? 1000.0 * step->value() : 1.0};
    if (dose->has("over") && !has_mass) {
      (void)dose->raw("over");
      dose->fault("over", "\"over\" with a step",
                  "a step stays on from \"at\" to the end of the test",
                  "Leave \"over\" out, or give the dose as a \"mass\" that took that long.");
    }
  }
  dose->finish();
}

void read_models(ObjectReader& reader, TracerTest& test) {
  const std::vector<std::string> known = rtd_model_names();
  if (!reader.has("models")) {
    test.models = known;
    return;
  }
  reader.each_element(
      "models", Need::optional, [&](const core::Json& node, const std::string& pointer) {
        if (node.is_object()) {
          ObjectReader user(reader.context(), node, pointer);
          if (const auto path = user.text("case", Need::required))
            test.model_cases.push_back(*path);
          user.finish();
          return;
        }
        const std::string name = node.is_string() ? node.get<std::string>() : std::string();
        const bool is_known = std::find(known.begin(), known.end(), name) != known.end();
        if (is_known &&
            std::find(test.models.begin(), test.models.end(), name) == test.models.end()) {
          test.models.push_back(name);
          return;
        }
        fault_at(reader, pointer, core::shown(node),
                 is_known ? "each model stands once in the list"
                          : "a model is one of ours or {\"case\": \"network.json\"}",
                 is_known ? "Take one of them out." : core::name_hint(name, known));
      });
  const core::Json* list = reader.raw("models");
  if (list->is_array() && list->empty()) {
    reader.fault("models", "an empty list", "at least one model is fitted",
                 "Leave \"models\" out to fit all of ours, or name some.");
  }
}

/// "background": a concentration, "before dose", or a straight line in time.
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

/// "background": "before dose": the mean of the samples before the dose, those under the limit at
/// half of it (common practice, no source). A drift seen in them is told but not followed: a few
/// days before the dose say nothing about the weeks after it.
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

double last_sample_time(const TracerTest& test) {
  double last = test.dose_at;
  for (const SamplingPoint& point : test.points) {
    if (!point.samples.empty()) last = std::max(last, point.samples.back().time);
  }
  return last;
}

/// The flow of a record over the time of the test.
void settle_mean_flow(ObjectReader& reader, TracerTest& test) {
  if (!test.flow_record) return;
  const double last = last_sample_time(test);
  const double mean = last > test.dose_at ? test.flow_record->mean(test.dose_at, last)
                                          : test.flow_record->value_from(test.dose_at);
  if (!(mean > 0.0)) {
    reader.fault("flow", "a record of no flow from the dose to the last sample",
                 "a tracer test needs flow through the tank",
                 "Check the columns of the record and its time against the dose.");
    return;
  }
  test.mean_flow = core::FlowRate(mean);
  double record_end = test.dose_at;
  while (const auto next = test.flow_record->next_switch(record_end)) record_end = *next;
  if (record_end < last && last - record_end > 0.02 * (last - test.dose_at)) {
    test.notes.push_back(fmt::format(
        "the last row of the flow record is {:.3g} d before the last sample; its flow of {:.4g} "
        "m3/d is taken until then",
        last - record_end, test.flow_record->value_from(record_end)));
  }
}

/// Places that our own models do not have: they are dosed in the feed and sampled at the outlet.
void check_places(ObjectReader& reader, const TracerTest& test) {
  static const std::array<std::string, 1> kOutlet = {"outlet"};
  static const std::array<std::string, 1> kFeed = {"feed"};
  if (!test.models.empty() && test.dose_into != "feed") {
    fault_at(reader, "/dose/into", "\"" + test.dose_into + "\"",
             "our own models are dosed in the \"feed\"",
             core::nearest_name(test.dose_into, kFeed)
                 ? "Did you mean \"feed\"?"
                 : "List only networks of your own, {\"case\": ..}, in \"models\".");
  }
  bool at_outlet = false;
  for (std::size_t i = 0; i < test.points.size(); ++i) {
    const std::string& at = test.points[i].at;
    at_outlet = at_outlet || at == "outlet";
    if (at == "outlet" || !test.model_cases.empty()) continue;
    fault_at(reader, fmt::format("/samples/{}/at", i), "\"" + at + "\"",
             "our own models are sampled at the \"outlet\"",
             core::nearest_name(at, kOutlet)
                 ? "Did you mean \"outlet\"?"
                 : "A zone can be named once \"models\" lists a network that has it.");
  }
  if (!at_outlet && !test.model_cases.empty()) {
    reader.fault("samples", "no point at the \"outlet\"",
                 "recovery and residence times are taken at the outlet",
                 "Add the samples of the outlet.");
  }
}

/// A test's own quantities are as stated: what is free are the parameters of its models.
void refuse_free_quantities(ObjectReader& reader,
                            const std::vector<core::FreeQuantity>& free_quantities) {
  for (const core::FreeQuantity& quantity : free_quantities) {
    if (!quantity.fit_low && !quantity.spread) continue;
    fault_at(reader, quantity.pointer, quantity.fit_low ? "\"fit\"" : "\"spread\"",
             "a quantity of a test is fixed; its models bring their own free parameters",
             "Write the value alone.");
  }
}

/// What is odd about the dose beside the samples, but no fault.
void note_dose(TracerTest& test) {
  const auto* pulse = std::get_if<PulseDose>(&test.dose);
  const double last = last_sample_time(test);
  if (pulse != nullptr && test.dose_at + pulse->duration > last) {
    test.notes.push_back(fmt::format(
        "the dose took {:.3g} d and was still running at the last sample", pulse->duration));
  }
  if (test.background.level + test.background.slope * (last - test.dose_at) < 0.0) {
    test.notes.push_back("the background as stated falls below zero before the last sample");
  }
}

}  // namespace

std::optional<TracerTest> read_tracer_test(const core::JsonDocument& document,
                                           const core::UnitReader& units, core::FaultList& faults) {
  std::vector<core::FreeQuantity> free_quantities;
  const core::ReadingContext context{document, units, faults, free_quantities};
  const std::size_t n_before = faults.all().size();
  ObjectReader reader(context, document.root(), "");
  static const std::array<std::string, 1> kKind = {"test/1"};
  (void)reader.word("stillzone", kKind, Need::required);
  TracerTest test;
  test.title = reader.text("title", Need::optional).value_or("Tracer test");
  const auto volume = reader.quantity<Measure::volume>("volume", Need::required,
                                                       ObjectReader::positive(Measure::volume));
  if (volume) test.volume = *volume;
  TestClock clock;
  read_dose(reader, clock, test);
  read_flow(reader, clock, test);
  read_background(reader, test);
  test.conservative = reader.flag("conservative", Need::optional).value_or(true);
  static const std::array<std::string, 2> kRecovery = {"fitted", "as dosed"};
  test.recovery_fitted =
      reader.word("recovery", kRecovery, Need::optional).value_or("fitted") == "fitted";
  read_models(reader, test);
  reader.each_element("samples", Need::required,
                      [&](const core::Json& node, const std::string& pointer) {
                        ObjectReader point(context, node, pointer);
                        if (auto read = read_sampling_point(point, clock, test)) {
                          test.points.push_back(std::move(*read));
                        }
                        point.finish();
                      });
  if (const core::Json* list = reader.raw("samples");
      list != nullptr && list->is_array() && list->empty()) {
    reader.fault(
        "samples", "an empty list", "a test has at least one sampling point",
        "Add {\"at\": \"outlet\", \"csv\": .., \"time\": .., \"value\": .., \"error\": ..}.");
  }
  refuse_free_quantities(reader, free_quantities);
  reader.finish();
  if (faults.all().size() > n_before) return std::nullopt;
  check_places(reader, test);
  background_from_samples(reader, test);
  settle_mean_flow(reader, test);
  if (faults.all().size() > n_before) return std::nullopt;
  note_dose(test);
  return test;
}

}  // namespace stillzone::network
