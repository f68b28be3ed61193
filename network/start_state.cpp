#include "network/start_state.hpp"

#include <string>

#include "core/require.hpp"

namespace stillzone::network {

std::vector<double> seeded_state(const Case& the_case, const StateLayout& layout) {
  const kinetics::KineticModel& model = the_case.kinetics;
  std::vector<double> y;
  y.reserve(layout.n_unknowns());
  for (std::size_t z = 0; z < layout.n_zones(); ++z) {
    for (const auto& component : model.components) y.push_back(component.seed);
    for (const auto& implicit : model.implicits) y.push_back(implicit.start);
  }
  for (std::size_t h = 0; h < layout.n_headspaces(); ++h) {
    for (const auto& gas : model.gases) y.push_back(gas.seed);
  }
  return y;
}

std::vector<double> given_state(const Case& the_case, const StateLayout& layout) {
  const kinetics::KineticModel& model = the_case.kinetics;
  const auto& given = the_case.run.given_start;
  std::vector<double> y(layout.n_unknowns(), 0.0);
  for (std::size_t z = 0; z < layout.n_zones(); ++z) {
    for (std::size_t i = 0; i < layout.n_implicits(); ++i) {
      y[layout.in_zone(z, layout.n_components() + i)] = model.implicits[i].start;
    }
    const auto place = given.find(the_case.zones[z].name);
    if (place == given.end()) continue;
    for (const auto& [name, value] : place->second) {
      const auto component = model.component(name);
      SZ_REQUIRE(component.has_value(), "start names component {}", name);
      y[layout.in_zone(z, *component)] = value;
    }
  }
  for (std::size_t h = 0; h < layout.n_headspaces(); ++h) {
    const auto place = given.find(the_case.headspaces[h].name);
    if (place == given.end()) {
      // An empty headspace would be a vacuum: nobody means that by leaving it out.
      for (std::size_t g = 0; g < model.gases.size(); ++g) {
        y[layout.in_headspace(h, g)] = model.gases[g].seed;
      }
      continue;
    }
    for (const auto& [name, value] : place->second) {
      const auto gas = model.gas(name);
      SZ_REQUIRE(gas.has_value(), "start names gas {}", name);
      y[layout.in_headspace(h, *gas)] = value;
    }
  }
  return y;
}

core::Result<std::vector<double>> start_state(const Case& the_case, DigesterSystem& system) {
  const bool given = the_case.run.start == RunSettings::Start::given;
  std::vector<double> y =
      given ? given_state(the_case, system.layout()) : seeded_state(the_case, system.layout());
  if (auto consistent = system.make_consistent(y); !consistent) {
    core::Failure failure = consistent.failure();
    failure.got_done =
        given ? "This is the state that \"start\" gives." : "This is the model's own seed.";
    return failure;
  }
  return y;
}

}  // namespace stillzone::network
