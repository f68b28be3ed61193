#include "cli/health_remarks.hpp"

#include <fmt/format.h>

#include <algorithm>
#include <optional>

namespace stillzone::cli {
namespace {

constexpr double kLowestPh = 6.6;
constexpr double kHighestPh = 8.2;
constexpr double kMostVfaToAlkalinity = 0.4;
/// A group is sheltered when the richest zone holds this many times what the mean of the tank does.
constexpr double kSheltered = 3.0;

std::optional<double> find(const network::PlaceState& place, const std::string& name) {
  for (const auto* list : {&place.state, &place.derived}) {
    for (const network::NamedValue& value : *list) {
      if (value.name == name) return value.value;
    }
  }
  return std::nullopt;
}

void remark_on_zone(const network::PlaceState& zone, std::vector<std::string>& remarks) {
  if (const auto ph = find(zone, "pH"); ph && (*ph < kLowestPh || *ph > kHighestPh)) {
    remarks.push_back(
        fmt::format("zone {} is at pH {:.2f}, outside {} to {}: methane formation "
                    "suffers there",
                    zone.place, *ph, kLowestPh, kHighestPh));
  }
  const auto vfa = find(zone, "VFA_as_acetic");
  const auto alkalinity = find(zone, "alkalinity");
  if (vfa && alkalinity && *vfa > kMostVfaToAlkalinity * std::max(*alkalinity, 1e-9)) {
    remarks.push_back(
        fmt::format("zone {} has VFA of {:.2f} kg/m3 as acetic acid beside an alkalinity "
                    "of {:.2f} kg/m3 as CaCO3, a ratio over {}: it is souring or sour",
                    zone.place, *vfa, *alkalinity, kMostVfaToAlkalinity));
  }
}

void remark_on_shelter(const network::Case& the_case, const network::RunResult& result,
                       const kinetics::Group& group, std::vector<std::string>& remarks) {
  const std::string& component = the_case.kinetics.components[group.component].name;
  double amount = 0.0;
  double volume = 0.0;
  double richest = 0.0;
  std::string place;
  for (std::size_t z = 0; z < result.zones.size(); ++z) {
    const double value = find(result.zones[z], component).value_or(0.0);
    amount += value * the_case.zones[z].volume.value();
    volume += the_case.zones[z].volume.value();
    if (value > richest) {
      richest = value;
      place = result.zones[z].place;
    }
  }
  const double mean = amount / volume;
  if (richest > kSheltered * mean &&
      richest > the_case.kinetics.components[group.component].floor) {
    remarks.push_back(fmt::format(
        "{} are sheltered in zone {} ({} {:.3g}, {:.1f} times the tank's mean): that the "
        "group lives on there does not mean that the digester works",
        group.name, place, component, richest, richest / mean));
  }
}

}  // namespace

std::vector<std::string> health_remarks(const network::Case& the_case,
                                        const network::RunResult& result) {
  std::vector<std::string> remarks;
  for (const network::PlaceState& zone : result.zones) remark_on_zone(zone, remarks);
  for (const kinetics::Group& group : the_case.kinetics.groups) {
    remark_on_shelter(the_case, result, group, remarks);
  }
  return remarks;
}

}  // namespace stillzone::cli
