#include "network/series_recorder.hpp"

#include <cmath>
#include <string>

namespace stillzone::network {

std::vector<double> record_times(double from, double until, double every) {
  SZ_REQUIRE(every > 0.0 && until >= from, "every {} from {} until {}", every, from, until);
  std::vector<double> times{from};
  // A last multiple within rounding of the end is the end.
  const double last = until - 1e-9 * every;
  for (double k = 1.0; from + k * every < last; k += 1.0) times.push_back(from + k * every);
  if (until > from) times.push_back(until);
  return times;
}

SeriesRecorder::SeriesRecorder(const Case& the_case, DigesterSystem& system,
                               SnapshotMaker& snapshots)
    : case_(the_case), system_(system), snapshots_(snapshots) {
  add_columns();
}

/// Columns in the order in which record() writes.
void SeriesRecorder::add_columns() {
  const kinetics::KineticModel& model = case_.kinetics;
  const auto add = [&](const std::string& place, const std::string& quantity,
                       const std::string& unit) {
    series_.columns.push_back({place, quantity, unit, {}});
  };
  const auto add_water = [&](const std::string& place) {
    for (const auto& component : model.components) add(place, component.name, component.unit);
    for (const auto& implicit : model.implicits) add(place, implicit.name, implicit.unit);
    for (const auto& derived : model.derived) add(place, derived.name, derived.unit);
  };
  for (const Zone& zone : case_.zones) add_water(zone.name);
  for (const Outlet& outlet : case_.outlets) {
    add(outlet.name, "flow", "m3/d");
    add_water(outlet.name);
  }
  for (const Headspace& headspace : case_.headspaces) {
    for (const auto& gas : model.gases) add(headspace.name, gas.name, gas.unit);
    add(headspace.name, "pressure", "bar");
    add(headspace.name, "gas_flow", "m3/d");
    add(headspace.name, "gas_flow_normal_dry", "m3/d");
    add(headspace.name, "methane_flow_normal", "m3/d");
  }
  for (const Feed& feed : case_.feeds) add(feed.name, "flow", "m3/d");
}

void SeriesRecorder::record(double t, std::span<const double> y) {
  const StateLayout& layout = system_.layout();
  const std::size_t n_unknowns = layout.n_zone_unknowns();
  const std::size_t n_derived = case_.kinetics.derived.size();
  const Snapshot snapshot = snapshots_.at(y, system_.operation().at(t));
  series_.time.push_back(t);
  auto column = series_.columns.begin();
  const auto add = [&](double value) { (column++)->values.push_back(value); };
  const auto add_all = [&](std::span<const double> values) {
    for (const double value : values) add(value);
  };
  for (std::size_t z = 0; z < layout.n_zones(); ++z) {
    add_all(layout.zone(y, z));
    add_all(std::span(snapshot.zone_derived).subspan(z * n_derived, n_derived));
  }
  for (std::size_t o = 0; o < case_.outlets.size(); ++o) {
    add(snapshot.outlet_flow[o]);
    add_all(std::span(snapshot.outlet_state).subspan(o * n_unknowns, n_unknowns));
    add_all(std::span(snapshot.outlet_derived).subspan(o * n_derived, n_derived));
  }
  for (std::size_t h = 0; h < layout.n_headspaces(); ++h) {
    add_all(layout.gases(y, h));
    add(snapshot.headspaces[h].pressure);
    add(snapshot.headspaces[h].flow);
    add(snapshot.headspaces[h].flow_normal_dry);
    add(snapshot.headspaces[h].methane_flow_normal);
  }
  add_all(snapshot.feed_flow);
  SZ_REQUIRE(column == series_.columns.end(), "a record fills all {} columns",
             series_.columns.size());
}

}  // namespace stillzone::network
