#include "network/water_quantity.hpp"

#include <algorithm>
#include <charconv>
#include <cmath>
#include <string>

#include "network/flow_solution.hpp"

namespace stillzone::network {
namespace {

/// Splits "/zones/core/volume" into its three parts, ~1 and ~0 undone (RFC 6901).
std::optional<std::array<std::string, 3>> three_parts(std::string_view pointer) {
  std::array<std::string, 3> parts;
  std::size_t n = 0;
  for (std::size_t i = 0; i < pointer.size(); ++i) {
    if (pointer[i] == '/') {
      if (++n > parts.size()) return std::nullopt;
      continue;
    }
    if (n == 0) return std::nullopt;
    char c = pointer[i];
    if (c == '~' && i + 1 < pointer.size()) c = pointer[++i] == '1' ? '/' : '~';
    parts[n - 1] += c;
  }
  if (n != parts.size()) return std::nullopt;
  return parts;
}

template <class Named>
std::optional<std::size_t> number_of(const std::vector<Named>& all, const std::string& name) {
  const auto found = std::ranges::find(all, name, &Named::name);
  if (found == all.end()) return std::nullopt;
  return static_cast<std::size_t>(found - all.begin());
}

double value_of(const Case& the_case, const WaterQuantity& quantity) {
  switch (quantity.kind) {
    case WaterQuantity::Kind::zone_volume:
      return the_case.zones[quantity.index].volume.value();
    case WaterQuantity::Kind::flow:
      return the_case.flows[quantity.index].given->value();
    case WaterQuantity::Kind::share:
      return the_case.flows[quantity.index].share->value();
    case WaterQuantity::Kind::feed_flow:
      return the_case.feeds[quantity.index].flow.value;
  }
  return 0.0;
}

/// d(row)/d(quantity) applied to the variables: what drives the derivative's equations. The rows
/// are affine in the quantity, so a difference over any distance is the derivative; only a drift's
/// own row holds 1/E.
std::vector<double> row_slopes(const FlowEquations& here, const FlowEquations& moved,
                               double distance, std::span<const double> x, const Case& water,
                               const WaterQuantity& quantity) {
  std::vector<double> slopes(here.rows.size(), 0.0);
  for (std::size_t r = 0; r < here.rows.size(); ++r) {
    if (here.meanings[r].kind == FlowEquations::Meaning::Kind::drift) {
      const bool own =
          quantity.kind == WaterQuantity::Kind::flow && here.meanings[r].index == quantity.index;
      const double e = own ? water.flows[quantity.index].given->value() : 1.0;
      if (own) slopes[r] = -x[here.rows[r][0].variable] / (e * e);
      continue;
    }
    for (std::size_t k = 0; k < here.rows[r].size(); ++k) {
      const double change = moved.rows[r][k].factor - here.rows[r][k].factor;
      slopes[r] += change / distance * x[here.rows[r][k].variable];
    }
  }
  return slopes;
}

}  // namespace

std::optional<WaterQuantity> water_quantity(const Case& the_case, std::string_view pointer) {
  using Kind = WaterQuantity::Kind;
  const auto parts = three_parts(pointer);
  if (!parts) return std::nullopt;
  const auto& [folder, name, key] = *parts;
  const auto made = [](Kind kind, std::optional<std::size_t> index) {
    return index ? std::optional(WaterQuantity{kind, *index}) : std::nullopt;
  };
  if (folder == "zones" && key == "volume") {
    return made(Kind::zone_volume, number_of(the_case.zones, name));
  }
  if (folder == "feeds" && key == "flow") {
    return made(Kind::feed_flow, number_of(the_case.feeds, name));
  }
  if (folder != "flows") return std::nullopt;
  std::size_t i = 0;
  const auto [end, error] = std::from_chars(name.data(), name.data() + name.size(), i);
  if (error != std::errc() || i >= the_case.flows.size()) return std::nullopt;
  if (key == "flow" && the_case.flows[i].given) return WaterQuantity{Kind::flow, i};
  if (key == "share" && the_case.flows[i].share) return WaterQuantity{Kind::share, i};
  return std::nullopt;
}

void set_water_quantity(Case& the_case, const WaterQuantity& quantity, double value) {
  switch (quantity.kind) {
    case WaterQuantity::Kind::zone_volume:
      the_case.zones[quantity.index].volume = core::Volume(value);
      break;
    case WaterQuantity::Kind::flow:
      the_case.flows[quantity.index].given = core::FlowRate(value);
      break;
    case WaterQuantity::Kind::share:
      the_case.flows[quantity.index].share = core::Share(value);
      break;
    case WaterQuantity::Kind::feed_flow:
      the_case.feeds[quantity.index].flow.value = value;
      break;
  }
}

Case water_of(const Case& the_case) {
  Case water;
  water.title = the_case.title;
  water.zones = the_case.zones;
  water.headspaces = the_case.headspaces;
  water.feeds = the_case.feeds;
  water.outlets = the_case.outlets;
  water.schedules = the_case.schedules;
  water.flows = the_case.flows;
  water.run = the_case.run;
  return water;
}

RateSlopes rate_slopes(const Case& water, std::span<const Stream> streams,
                       std::span<const WaterQuantity> quantities) {
  const FlowSolution here(water);
  const SwitchState state = here.mean_state(water, 0.0);
  const std::vector<double> x = here.variables(water, state);
  RateSlopes result;
  result.rates = stream_rates(streams, water, here.equations, x);
  const std::size_t n = x.size();
  for (const WaterQuantity& quantity : quantities) {
    if (quantity.kind == WaterQuantity::Kind::zone_volume) {
      result.slopes.emplace_back(streams.size(), 0.0);
      continue;
    }
    Case moved = water_of(water);
    const double value = value_of(water, quantity);
    const double distance = value > 0.0 ? -0.5 * value : 0.5;
    set_water_quantity(moved, quantity, value + distance);
    const FlowSolution there(moved);
    const SwitchState moved_state = there.mean_state(moved, 0.0);
    const std::vector<double> known = there.known_variables(moved, moved_state);
    const std::vector<double> known_here = here.known_variables(water, state);
    const std::vector<double> driven =
        row_slopes(here.equations, there.equations, distance, x, water, quantity);
    std::vector<FlowSystem::Row> rows = here.equations.rows;
    std::vector<bool> is_known = here.equations.known;
    std::vector<double> dx(n + rows.size(), 0.0);
    for (std::size_t i = 0; i < n; ++i) dx[i] = (known[i] - known_here[i]) / distance;
    for (std::size_t r = 0; r < rows.size(); ++r) {
      rows[r].push_back({n + r, 1.0});
      is_known.push_back(true);
      dx[n + r] = driven[r];
    }
    FlowSystem(std::move(rows), std::move(is_known)).substitute(dx);
    std::vector<double> slopes;
    for (const Stream& stream : streams) {
      double slope = dx[stream.flow];
      const Flow& flow = water.flows[stream.flow];
      if (flow.exchange) {
        const std::size_t drift = here.equations.drift(stream.flow);
        const double sign = stream.from == flow.from ? 1.0 : -1.0;
        if (sign * x[drift] > 0.0) slope += sign * dx[drift];
      }
      slopes.push_back(slope);
    }
    result.slopes.push_back(std::move(slopes));
  }
  return result;
}

}  // namespace stillzone::network
