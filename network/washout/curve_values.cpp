#include "network/washout/curve_values.hpp"

#include <algorithm>
#include <cmath>
#include <limits>

#include "core/continuation/spectrum.hpp"

namespace stillzone::network {

namespace {

constexpr double kNone = std::numeric_limits<double>::quiet_NaN();

std::optional<std::size_t> derived_number(const kinetics::KineticModel& model,
                                          const std::string& name) {
  for (std::size_t d = 0; d < model.derived.size(); ++d) {
    if (model.derived[d].name == name) return d;
  }
  return std::nullopt;
}

}  // namespace

CurveValues::CurveValues(const Case& the_case, LoadedDigester& loaded, std::size_t most_unknowns)
    : case_(the_case),
      loaded_(loaded),
      snapshots_(the_case, loaded.digester()),
      most_unknowns_(most_unknowns) {
  for (const Zone& zone : the_case.zones) volume_ += zone.volume.value();
}

double CurveValues::mean_of(std::span<const double> y, std::size_t component) const {
  const StateLayout& layout = loaded_.digester().layout();
  double sum = 0.0;
  for (std::size_t z = 0; z < case_.zones.size(); ++z) {
    sum += case_.zones[z].volume.value() * y[layout.in_zone(z, component)];
  }
  return sum / volume_;
}

void CurveValues::read_outlets(const Snapshot& snapshot, CurvePoint& point) const {
  const kinetics::KineticModel& model = case_.kinetics;
  const std::size_t n = model.n_zone_unknowns();
  const std::size_t n_derived = model.derived.size();
  const auto vfa = derived_number(model, model.vfa);
  const auto derived_ph = derived_number(model, "pH");
  double flow = 0.0;
  double vfa_flow = 0.0;
  double cod_flow = 0.0;
  std::size_t largest = 0;
  for (std::size_t o = 0; o < case_.outlets.size(); ++o) {
    const double here = snapshot.outlet_flow[o];
    flow += here;
    if (here > snapshot.outlet_flow[largest]) largest = o;
    if (vfa) vfa_flow += here * snapshot.outlet_derived[o * n_derived + *vfa];
    for (std::size_t i = 0; i < model.components.size(); ++i) {
      cod_flow += here * model.components[i].content.cod * snapshot.outlet_state[o * n + i];
    }
  }
  point.vfa = vfa && flow > 0.0 ? vfa_flow / flow : kNone;
  point.effluent_cod = flow > 0.0 ? cod_flow / flow : kNone;
  point.ph = derived_ph ? snapshot.outlet_derived[largest * n_derived + *derived_ph] : kNone;
  for (std::size_t i = 0; i < model.implicits.size(); ++i) {
    if (model.implicits[i].name != "pH") continue;
    point.ph = snapshot.outlet_state[largest * n + model.components.size() + i];
  }
  double fed = 0.0;
  double fed_cod = 0.0;
  for (std::size_t f = 0; f < case_.feeds.size(); ++f) {
    fed += snapshot.feed_flow[f];
    const auto state = loaded_.point().feed(f, model.components.size());
    for (std::size_t i = 0; i < model.components.size(); ++i) {
      fed_cod += snapshot.feed_flow[f] * model.components[i].content.cod * state[i];
    }
  }
  point.hrt_d = volume_ / fed;
  point.cod_removed = fed_cod > 0.0 ? 1.0 - cod_flow / fed_cod : kNone;
}

CurvePoint CurveValues::point(std::span<const double> y, double load) {
  loaded_.set_parameter(load);
  CurvePoint point;
  point.load = load;
  point.y.assign(y.begin(), y.end());
  const Snapshot snapshot = snapshots_.at(y, loaded_.point());
  read_outlets(snapshot, point);
  for (const HeadspaceReading& reading : snapshot.headspaces) {
    point.methane_flow += reading.methane_flow_normal;
  }
  for (const auto& group : case_.kinetics.groups) {
    point.biomass.push_back(mean_of(y, group.component));
  }
  if (const auto spectrum = core::spectrum_at(loaded_.digester(), y, most_unknowns_)) {
    point.stable = spectrum->stable();
    point.recovery_rate = -spectrum->dominant.real();
  }
  return point;
}

std::vector<bool> CurveValues::living(std::span<const double> y, double load) {
  loaded_.set_parameter(load);
  const kinetics::KineticModel& model = case_.kinetics;
  const StateLayout& layout = loaded_.digester().layout();
  const OperatingPoint& point = loaded_.point();
  const auto streams = loaded_.digester().operation().balance().streams();
  std::vector<bool> lives;
  for (const auto& group : model.groups) {
    double in = 0.0;
    double out = 0.0;
    double highest = 0.0;
    for (std::size_t z = 0; z < layout.n_zones(); ++z) {
      highest = std::max(highest, y[layout.in_zone(z, group.component)]);
    }
    for (std::size_t s = 0; s < streams.size(); ++s) {
      const auto& [from, to, flow] = streams[s];
      const bool leaves = to.kind == Place::Kind::outlet;
      if (from.kind == Place::Kind::feed) {
        const double carried =
            point.rates[s] * point.feed(from.index, layout.n_components())[group.component];
        in += carried;
        if (leaves) out += carried;
      } else if (leaves) {
        out += point.rates[s] * y[layout.in_zone(from.index, group.component)];
      }
    }
    const double floor = model.components[group.component].floor;
    lives.push_back(out > in * (1.0 + 1e-6) && highest > floor);
  }
  return lives;
}

}  // namespace stillzone::network
