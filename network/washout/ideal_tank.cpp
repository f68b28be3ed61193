#include "network/washout/ideal_tank.hpp"

#include <algorithm>

namespace stillzone::network {

namespace {

/// Mean of a quantity weighted by volume.
template <class Quantity>
class VolumeMean {
 public:
  void add(double volume, Quantity value) {
    volume_ += volume;
    sum_ += volume * value.value();
    first_ = count_ == 0 ? value : first_;
    same_ = same_ && value == first_;
    ++count_;
  }
  [[nodiscard]] Quantity mean() const { return same_ ? first_ : Quantity(sum_ / volume_); }

 private:
  double volume_ = 0.0;
  double sum_ = 0.0;
  Quantity first_{};
  bool same_ = true;
  int count_ = 0;
};

Headspace joined_headspace(const Case& the_case) {
  Headspace joined;
  joined.name = "gas";
  VolumeMean<core::Temperature> temperature;
  VolumeMean<core::Pressure> back;
  VolumeMean<core::Pressure> opening;
  for (const Headspace& headspace : the_case.headspaces) {
    const double volume = headspace.volume.value();
    joined.volume = joined.volume + headspace.volume;
    joined.pipe.coefficient = joined.pipe.coefficient + headspace.pipe.coefficient;
    temperature.add(volume, headspace.temperature);
    back.add(volume, headspace.pipe.back_pressure);
    opening.add(volume, headspace.pipe.opening_pressure);
  }
  joined.temperature = temperature.mean();
  joined.pipe.back_pressure = back.mean();
  joined.pipe.opening_pressure = opening.mean();
  return joined;
}

/// A start given zone by zone: the content of all zones in one tank, the gas of all in one dome.
void join_given_start(const Case& the_case, Case& ideal) {
  if (the_case.run.start != RunSettings::Start::given) return;
  ideal.run.given_start.clear();
  const double volume = ideal.zones.front().volume.value();
  for (const Zone& zone : the_case.zones) {
    const auto given = the_case.run.given_start.find(zone.name);
    if (given == the_case.run.given_start.end()) continue;
    for (const auto& [name, value] : given->second) {
      ideal.run.given_start["tank"][name] += value * (zone.volume.value() / volume);
    }
  }
  for (const Headspace& headspace : the_case.headspaces) {
    const auto given = the_case.run.given_start.find(headspace.name);
    if (given == the_case.run.given_start.end()) continue;
    const double part = headspace.volume / ideal.headspaces.front().volume;
    for (const auto& [name, value] : given->second) {
      ideal.run.given_start["gas"][name] += value * part;
    }
  }
}

}  // namespace

Case ideal_tank(const Case& the_case) {
  Case ideal = the_case;
  Zone tank;
  tank.name = "tank";
  VolumeMean<core::Temperature> temperature;
  VolumeMean<core::Rate> transfer;
  bool gas = false;
  for (const Zone& zone : the_case.zones) {
    tank.volume = tank.volume + zone.volume;
    temperature.add(zone.volume.value(), zone.temperature);
    if (!zone.gas) continue;
    transfer.add(zone.volume.value(), zone.gas->coefficient);
    gas = true;
  }
  tank.temperature = temperature.mean();
  ideal.headspaces.clear();
  if (gas) {
    tank.gas = GasTransfer{HeadspaceIndex(0), transfer.mean()};
    ideal.headspaces.push_back(joined_headspace(the_case));
  }
  ideal.zones = {tank};
  ideal.outlets = {{"outlet"}};
  ideal.flows.clear();
  const Place in_tank{Place::Kind::zone, 0};
  for (std::size_t f = 0; f < ideal.feeds.size(); ++f) {
    Flow flow;
    flow.from = {Place::Kind::feed, f};
    flow.to = in_tank;
    ideal.flows.push_back(flow);
  }
  Flow out;
  out.from = in_tank;
  out.to = {Place::Kind::outlet, 0};
  ideal.flows.push_back(out);
  ideal.free_quantities.clear();
  ideal.joint_spread.reset();
  ideal.warnings.clear();
  join_given_start(the_case, ideal);
  return ideal;
}

}  // namespace stillzone::network
