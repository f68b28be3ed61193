#include <algorithm>
#include <cmath>

#include "network/tracer/tracer_test.hpp"

namespace stillzone::network {
namespace {

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

}  // namespace

double TracerTest::turnovers(double t) const {
  const double v = volume.value();
  if (!flow_record) return mean_flow.value() * (t - dose_at) / v;
  return t >= dose_at ? volume_passed(*flow_record, dose_at, t) / v
                      : -volume_passed(*flow_record, t, dose_at) / v;
}

double TracerTest::time_at(double wanted) const {
  if (!flow_record || wanted <= 0.0) return dose_at + wanted * volume.value() / mean_flow.value();
  double t = dose_at;
  double left = wanted * volume.value();
  while (true) {
    const double flow = flow_record->value_from(t);
    const auto next = flow_record->next_switch(t);
    const double room = next ? flow * (*next - t) : HUGE_VAL;
    if (left <= room) return flow > 0.0 ? t + left / flow : t;
    left -= room;
    t = *next;
  }
}

}  // namespace stillzone::network
