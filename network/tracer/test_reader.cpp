#include <fmt/format.h>

#include <algorithm>
#include <array>
#include <cmath>
#include <utility>

#include "core/near_name.hpp"
#include "network/tracer/rtd_model.hpp"
#include "network/tracer/sample_reader.hpp"
#include "network/tracer/tracer_test.hpp"

namespace stillzone::network {
namespace {

using core::Measure;
using core::ObjectReader;
using Need = ObjectReader::Need;

/// "flow": a quantity, or a record.
void read_flow(ObjectReader& reader, TracerTest& test) {
  const core::Json* node = reader.raw("flow");
  if (node == nullptr) {
    reader.fault(
        "flow", "no flow", "a test needs the flow through the tank",
        "Add \"flow\": \"150 m3/d\", or a record {\"csv\": .., \"time\": .., \"value\": ..}.");
    return;
  }
  if (!node->is_object() || !node->contains("csv")) {
    const auto flow = reader.quantity<Measure::flow>("flow", Need::required,
                                                     ObjectReader::positive(Measure::flow));
    if (flow) test.mean_flow = *flow;
    return;
  }
  auto record = reader.object("flow", Need::required);
  if (!record) return;
  test.flow_record = core::read_record(*record, Measure::flow);
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
    dose->fault("", has_mass ? "\"mass\" and \"step\"" : "neither \"mass\" nor \"step\"",
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
  }
  if (has_step) {
    const auto step = dose->quantity<Measure::concentration>(
        "step", Need::required, ObjectReader::positive(Measure::concentration));
    test.dose = StepDose{step ? 1000.0 * step->value() : 1.0};
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
        if (std::find(known.begin(), known.end(), name) != known.end()) {
          test.models.push_back(name);
          return;
        }
        reader.context().faults.add(
            {.file = reader.context().document.name(),
             .pointer = pointer,
             .line = reader.context().document.line_of(pointer),
             .found = core::shown(node),
             .allowed = "a model is one of ours or {\"case\": \"network.json\"}",
             .way_out = core::name_hint(name, known)});
      });
}

/// Mean and drift of what was there before the dose.
void read_background(ObjectReader& reader, TracerTest& test) {
  const core::Json* node = reader.raw("background");
  if (node == nullptr) {
    test.background.how = "none stated, taken as 0";
    return;
  }
  if (node->is_string() && node->get<std::string>() == "before dose") {
    test.background.how = "before dose";
    return;
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

/// "background": "before dose" needs the samples, so it comes after them.
void background_from_samples(ObjectReader& reader, TracerTest& test) {
  if (test.background.how != "before dose") return;
  double sum = 0.0;
  std::size_t n = 0;
  for (const SamplingPoint& point : test.points) {
    for (const TracerSample& sample : point.before) {
      sum += sample.censored ? 0.5 * sample.value : sample.value;
      ++n;
    }
  }
  if (n == 0) {
    reader.fault("background", "\"before dose\"", "no sample was taken before the dose",
                 "State the background as a concentration, or add the earlier samples.");
    return;
  }
  test.background.level = sum / static_cast<double>(n);
  test.background.how = fmt::format("mean of {} samples before the dose", n);
}

/// The flow of a record over the time of the test.
void settle_mean_flow(TracerTest& test) {
  if (!test.flow_record) return;
  double last = test.dose_at;
  for (const SamplingPoint& point : test.points) {
    if (!point.samples.empty()) last = std::max(last, point.samples.back().time);
  }
  test.mean_flow = core::FlowRate(last > test.dose_at ? test.flow_record->mean(test.dose_at, last)
                                                      : test.flow_record->value_from(test.dose_at));
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
  read_flow(reader, test);
  TestClock clock;
  read_dose(reader, clock, test);
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
  background_from_samples(reader, test);
  reader.finish();
  if (faults.all().size() > n_before) return std::nullopt;
  settle_mean_flow(test);
  return test;
}

}  // namespace stillzone::network
