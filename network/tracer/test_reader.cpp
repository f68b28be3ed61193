#include <fmt/format.h>

#include <algorithm>
#include <array>
#include <cmath>
#include <utility>

#include "core/near_name.hpp"
#include "network/tracer/background_reader.hpp"
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

/// True when the file says that it is a tracer test; else one fault, and the rest is not worth
/// reading.
bool is_a_test(ObjectReader& reader) {
  const core::Json* kind = reader.raw("stillzone");
  if (kind == nullptr) {
    reader.fault("", "no key \"stillzone\"", "a tracer test starts with \"stillzone\": \"test/1\"",
                 "Add it as the first key.");
    return false;
  }
  const std::string name = kind->is_string() ? kind->get<std::string>() : std::string();
  if (name == "test/1") return true;
  reader.fault("stillzone", core::shown(*kind), "this command takes a tracer test, \"test/1\"",
               name == "case/1"    ? "A case goes to \"stillzone run\" or \"stillzone check\"."
               : name == "study/1" ? "A study goes to \"stillzone retrofit\"."
                                   : "Write \"stillzone\": \"test/1\".");
  return false;
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
  if (!reader.has("dose")) {
    (void)reader.raw("dose");
    reader.fault("", "no \"dose\"", "a test says what was dosed and when",
                 "Add \"dose\": {\"tracer\": \"lithium\", \"mass\": \"24 kg\", \"at\": \"0 d\"}.");
    return;
  }
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

void read_points(ObjectReader& reader, const TestClock& clock, TracerTest& test) {
  const core::Json* list = reader.raw("samples");
  if (list == nullptr || (list->is_array() && list->empty())) {
    reader.fault(list == nullptr ? "" : "samples",
                 list == nullptr ? "no \"samples\"" : "an empty list",
                 "a test has at least one sampling point",
                 "Add \"samples\": [{\"at\": \"outlet\", \"csv\": .., \"time\": .., \"value\": .., "
                 "\"error\": ..}].");
    return;
  }
  reader.each_element("samples", Need::required,
                      [&](const core::Json& node, const std::string& pointer) {
                        ObjectReader point(reader.context(), node, pointer);
                        if (auto read = read_sampling_point(point, clock, test)) {
                          test.points.push_back(std::move(*read));
                        }
                        point.finish();
                      });
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
  if (!document.root().is_object() || !is_a_test(reader)) return std::nullopt;
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
  static const std::array<std::string, 2> kLoss = {"squares", "robust"};
  test.robust = reader.word("loss", kLoss, Need::optional).value_or("squares") == "robust";
  read_models(reader, test);
  read_points(reader, clock, test);
  (void)reader.raw("plan");  // for `stillzone plan`
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
