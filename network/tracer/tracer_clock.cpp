#include <algorithm>
#include <cmath>
#include <vector>

#include "network/tracer/tracer_test.hpp"

namespace stillzone::network {
namespace {

constexpr double kFarthest = 1e9;  // [d] before any record

/// Integral of the flow from a to b >= a [m3], exact: the record is constant between its steps.
double volume_passed(const core::Timeline& flow, double a, double b) {
  double passed = 0.0;
  double t = a;
  while (t < b) {
    const double end = std::min(flow.next_switch(t).value_or(b), b);
    passed += flow.value_from(t) * (end - t);
    t = end;
  }
  return passed;
}

/// Time [d] at which a volume [m3] was still to pass until `end`; -infinity when it never was.
double time_before(const core::Timeline& flow, double end, double to_pass) {
  // Switches before `end`, found forward from far enough back: the first value holds before them.
  std::vector<double> switches;
  for (auto next = flow.next_switch(-kFarthest); next && *next < end;
       next = flow.next_switch(*next)) {
    switches.push_back(*next);
  }
  double t = end;
  while (!switches.empty()) {
    const double start = switches.back();
    switches.pop_back();
    const double passed = flow.value_from(start) * (t - start);
    if (to_pass < passed) return t - to_pass / flow.value_from(start);
    to_pass -= passed;
    t = start;
  }
  const double first = flow.value_from(-kFarthest);
  return first > 0.0 ? t - to_pass / first : -HUGE_VAL;
}

}  // namespace

double TracerTest::turnovers(double t) const {
  const double v = volume.value();
  if (!flow_record) return mean_flow.value() * (t - dose_at) / v;
  return t >= dose_at ? volume_passed(*flow_record, dose_at, t) / v
                      : -volume_passed(*flow_record, t, dose_at) / v;
}

double TracerTest::time_at(double turnovers) const {
  if (!flow_record) return dose_at + turnovers * volume.value() / mean_flow.value();
  const double v = volume.value();
  if (turnovers < 0.0) return time_before(*flow_record, dose_at, -turnovers * v);
  double t = dose_at;
  double left = turnovers * v;
  while (left > 0.0) {
    const double flow = flow_record->value_from(t);
    const auto next = flow_record->next_switch(t);
    const double passed = next ? flow * (*next - t) : HUGE_VAL;
    if (flow > 0.0 && left <= passed) return t + left / flow;
    if (!next) return HUGE_VAL;  // the flow has stopped for good
    left -= passed;
    t = *next;
  }
  return t;
}

}  // namespace stillzone::network
