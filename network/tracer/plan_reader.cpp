#include "network/tracer/plan_reader.hpp"

#include <fmt/format.h>

#include <algorithm>
#include <array>

#include "network/tracer/sample_reader.hpp"

namespace stillzone::network {
namespace {

using core::Measure;
using core::ObjectReader;
using Need = ObjectReader::Need;

void read_dose(ObjectReader& reader, PlanRequest& request) {
  PulseDose pulse;
  if (auto dose = reader.object("dose", Need::optional)) {
    request.test.tracer = dose->text("tracer", Need::optional).value_or("lithium");
    (void)dose->raw("at");
    (void)dose->raw("into");
    if (dose->has("step")) {
      (void)dose->raw("step");
      dose->fault("step", "a step", "pulses are planned, at once or over some time",
                  "Leave \"step\" out.");
    }
    const auto mass = dose->quantity<Measure::mass>("mass", Need::optional,
                                                    ObjectReader::positive(Measure::mass));
    if (mass) pulse.mass = 1000.0 * mass->value();
    const auto over = dose->quantity<Measure::duration>(
        "over", Need::optional, ObjectReader::not_negative(Measure::duration));
    if (over) pulse.duration = over->value();
    dose->finish();
  }
  request.test.dose = pulse;
}

void read_suspects(ObjectReader& plan, PlanRequest& request) {
  auto reader = plan.object("suspect", Need::optional);
  if (!reader) return;
  const auto share = [&](const char* key, double& value) {
    ObjectReader::Limit limit{.low = 0.0, .high = 0.9, .low_open = true, .clause = {}};
    limit.clause = "a suspected share lies between 0 and 90 %";
    const auto read = reader->quantity<Measure::share>(key, Need::optional, limit);
    if (read) value = read->value();
  };
  share("dead_fraction", request.suspect.dead_fraction);
  share("bypass_fraction", request.suspect.bypass_fraction);
  share("stagnant_fraction", request.suspect.stagnant_fraction);
  const auto exchange = reader->quantity<Measure::flow>("exchange_flow", Need::optional,
                                                        ObjectReader::positive(Measure::flow));
  if (exchange) request.suspect.exchange_flow = exchange->value();
  reader->finish();
}

void read_times(ObjectReader& plan, double tau, PlanRequest& request) {
  const auto time = [&](const char* key, double usual) {
    const auto read = plan.quantity<Measure::duration>(key, Need::optional,
                                                       ObjectReader::positive(Measure::duration));
    return read ? read->value() : usual;
  };
  request.duration = time("duration", 3.0 * tau);
  request.earliest = time("earliest", 1.0 / 24.0);
  request.shortest_gap = time("shortest_gap", 1.0 / 24.0);
  const auto samples = plan.integer("samples", Need::optional);
  if (samples && (*samples < 6 || *samples > 200)) {
    plan.fault("samples", fmt::format("{}", *samples), "6 to 200 samples are planned",
               "25 is usual for one test.");
  } else if (samples) {
    request.n_samples = static_cast<std::size_t>(*samples);
  }
  const double room = request.duration - request.earliest;
  if (room < request.shortest_gap * static_cast<double>(request.n_samples)) {
    plan.fault("duration",
               fmt::format("{:.3g} d for {} samples {:.3g} d apart", request.duration,
                           request.n_samples, request.shortest_gap),
               "the samples must fit between \"earliest\" and \"duration\"",
               "Plan fewer samples, a longer test or a shorter gap.");
  }
}

}  // namespace

std::optional<PlanRequest> read_plan_request(const core::JsonDocument& document,
                                             const core::UnitReader& units,
                                             core::FaultList& faults) {
  std::vector<core::FreeQuantity> free_quantities;
  const core::ReadingContext context{document, units, faults, free_quantities};
  const std::size_t n_before = faults.all().size();
  ObjectReader reader(context, document.root(), "");
  if (!document.root().is_object()) return std::nullopt;
  static const std::array<std::string, 1> kKind = {"test/1"};
  if (!reader.word("stillzone", kKind, Need::required)) return std::nullopt;
  PlanRequest request;
  TracerTest& test = request.test;
  test.title = reader.text("title", Need::optional).value_or("Tracer test");
  const auto volume = reader.quantity<Measure::volume>("volume", Need::required,
                                                       ObjectReader::positive(Measure::volume));
  if (volume) test.volume = *volume;
  if (const auto flow = document.root().find("flow");
      flow != document.root().end() && flow->is_object() && flow->contains("csv")) {
    (void)reader.raw("flow");
    reader.fault("flow", "a record", "a test is planned for the flow expected",
                 "Give it with --set \"/flow=150 m3/d\".");
  } else if (const auto read = reader.quantity<Measure::flow>(
                 "flow", Need::required, ObjectReader::positive(Measure::flow))) {
    test.mean_flow = *read;
  }
  read_dose(reader, request);
  test.dose_into = "feed";
  if (const auto* level = reader.raw("background");
      level != nullptr && level->is_string() && level->get<std::string>() != "before dose") {
    const auto read = reader.quantity<Measure::concentration>(
        "background", Need::optional, ObjectReader::not_negative(Measure::concentration));
    if (read) test.background.level = 1000.0 * read->value();
  }
  static const std::array<std::string, 2> kRecovery = {"fitted", "as dosed"};
  test.recovery_fitted =
      reader.word("recovery", kRecovery, Need::optional).value_or("fitted") == "fitted";
  for (const char* key : {"samples", "models", "loss", "conservative"}) (void)reader.raw(key);
  test.points.emplace_back();
  test.points[0].at = "outlet";
  if (auto plan = reader.object("plan", Need::required)) {
    const ErrorModel error = read_error(*plan);
    test.points[0].error_absolute = error.absolute;
    test.points[0].error_relative = error.relative;
    const auto limit = plan->quantity<Measure::concentration>(
        "detection_limit", Need::required, ObjectReader::positive(Measure::concentration));
    if (limit) test.points[0].detection_limit = 1000.0 * limit->value();
    const auto peak = plan->quantity<Measure::concentration>(
        "peak", Need::optional, ObjectReader::positive(Measure::concentration));
    if (peak) request.peak = 1000.0 * peak->value();
    if (volume && test.mean_flow.value() > 0.0) {
      read_times(*plan, test.volume.value() / test.mean_flow.value(), request);
    }
    read_suspects(*plan, request);
    plan->finish();
  }
  reader.finish();
  if (faults.all().size() > n_before) return std::nullopt;
  return request;
}

}  // namespace stillzone::network
