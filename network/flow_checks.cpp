#include "network/flow_checks.hpp"

#include <fmt/format.h>

#include <algorithm>
#include <cmath>

#include "network/zone_graph.hpp"

namespace stillzone::network {

namespace {

/// In one case this many faults are worth reading; the rest follow from them or are like them.
constexpr std::size_t kMostFaults = 25;
constexpr std::size_t kMostListed = 6;
constexpr double kAgreement = 1e-6;  ///< relative, to which given flows must agree

std::string escaped(const std::string& name) {
  std::string text;
  for (const char c : name) text += c == '~' ? std::string("~0") : std::string(1, c);
  return text;
}

std::string rate(double value) { return fmt::format("{:.6g} m3/d", value); }

}  // namespace

std::string pointer_of(const Case& the_case, Place place) {
  switch (place.kind) {
    case Place::Kind::zone:
      return "/zones/" + escaped(the_case.name_of(place));
    case Place::Kind::feed:
      return "/feeds/" + escaped(the_case.name_of(place));
    case Place::Kind::outlet:
      return fmt::format("/outlets/{}", place.index);
  }
  return "";
}

void FlowChecks::fault(const std::string& pointer, std::string found, std::string allowed,
                       std::string way_out) {
  if (++n_found_ > kMostFaults) return;
  faults_.add({.file = document_.name(),
               .pointer = pointer,
               .line = document_.line_of(pointer),
               .found = std::move(found),
               .allowed = std::move(allowed),
               .way_out = std::move(way_out)});
}

std::string FlowChecks::flow_name(std::size_t flow) const {
  const Flow& line = case_.flows[flow];
  return fmt::format("\"{}\" to \"{}\"", case_.name_of(line.from), case_.name_of(line.to));
}

std::string FlowChecks::flow_list(std::span<const std::size_t> flows) const {
  std::string text;
  for (std::size_t i = 0; i < flows.size() && i < kMostListed; ++i) {
    text += fmt::format("{}{} ({})", i == 0 ? "" : ", ", flow_name(flows[i]),
                        case_.flows[flows[i]].pointer);
  }
  if (flows.size() > kMostListed) text += fmt::format(" and {} more", flows.size() - kMostListed);
  return text;
}

void FlowChecks::graph(const std::vector<bool>& carries) {
  const PlaceNumbering number(case_);
  std::vector<Link> links;
  std::vector<bool> joined(number.n_places(), false);
  for (std::size_t i = 0; i < case_.flows.size(); ++i) {
    const Flow& flow = case_.flows[i];
    joined[number.of(flow.from)] = true;
    joined[number.of(flow.to)] = true;
    if (!carries[i]) continue;
    links.push_back({number.of(flow.from), number.of(flow.to)});
    if (flow.exchange) links.push_back({number.of(flow.to), number.of(flow.from)});
  }
  for (std::size_t f = 0; f < case_.feeds.size(); ++f) {
    const Place feed{Place::Kind::feed, f};
    if (joined[number.of(feed)] || !troubled_.insert(feed).second) continue;
    fault(pointer_of(case_, feed), fmt::format("no flow leaves feed \"{}\"", case_.name_of(feed)),
          "a feed must go somewhere", "Add a flow from it or take the feed out.");
  }
  for (std::size_t o = 0; o < case_.outlets.size(); ++o) {
    const Place outlet{Place::Kind::outlet, o};
    if (joined[number.of(outlet)] || !troubled_.insert(outlet).second) continue;
    fault(pointer_of(case_, outlet),
          fmt::format("no flow enters outlet \"{}\"", case_.name_of(outlet)),
          "an outlet must take something", "Add a flow to it or take the outlet out.");
  }
  const ZoneGraph graph(number.n_places(), links);
  const auto fed = graph.reached_from(number.feeds());
  const auto drained = graph.leading_to(number.outlets());
  for (std::size_t z = 0; z < case_.zones.size(); ++z) {
    const Place zone{Place::Kind::zone, z};
    if ((fed[z] && drained[z]) || !troubled_.insert(zone).second) continue;
    const std::string& name = case_.name_of(zone);
    if (!fed[z] && !drained[z]) {
      fault(
          pointer_of(case_, zone),
          fmt::format("zone \"{}\" is cut off: no feed reaches it and it reaches no outlet", name),
          "every zone must take part in the flow",
          "Join it with an exchange or with flows greater than 0, or take the zone out.");
    } else if (!fed[z]) {
      fault(pointer_of(case_, zone), fmt::format("no feed reaches zone \"{}\"", name),
            "every zone must be fed, by a flow or an exchange greater than 0",
            "Add a flow or an exchange that leads to it.");
    } else {
      fault(pointer_of(case_, zone), fmt::format("zone \"{}\" reaches no outlet", name),
            "water that enters a zone must be able to leave",
            "Add a flow from it to an outlet or to a zone that reaches one.");
    }
  }
}

void FlowChecks::shares(const FlowEquations& equations) {
  const auto check = [&](Place place, const std::vector<std::size_t>& leaving) {
    const ShareSum sum = share_sum(case_, leaving);
    if (sum.adds_up()) return;
    troubled_.insert(place);
    std::vector<std::size_t> shared;
    for (const std::size_t i : leaving) {
      if (case_.flows[i].share) shared.push_back(i);
    }
    const bool over = sum.sum > 1.0;
    fault(
        pointer_of(case_, place),
        fmt::format("the shares that leave \"{}\" add up to {:.6g}", case_.name_of(place), sum.sum),
        over ? "together they take at most 1"
             : "they must add up to 1 when no other flow takes the rest",
        over ? fmt::format("Lower one of {}.", flow_list(shared))
             : fmt::format("Leave the share of one out, then it takes the rest: {}.",
                           flow_list(shared)));
  };
  for (std::size_t f = 0; f < case_.feeds.size(); ++f) {
    check({Place::Kind::feed, f}, equations.out_of_feed[f]);
  }
  for (std::size_t z = 0; z < case_.zones.size(); ++z) {
    check({Place::Kind::zone, z}, equations.out_of_zone[z]);
  }
}

void FlowChecks::open_flows(const FlowEquations& equations, const FlowSystem& system) {
  const std::size_t n_free = system.n_free();
  if (n_free == 0) return;
  constexpr std::size_t kMostDirections = 8;
  std::size_t n_told = 0;
  for (const auto& direction : system.free_directions(kMostDirections)) {
    std::vector<std::size_t> flows;
    bool follows = false;
    for (const FlowSystem::Term& term : direction) {
      const auto i = equations.flow_of(term.variable);
      if (!i) continue;
      flows.push_back(*i);
      const Flow& flow = case_.flows[*i];
      follows = follows || troubled(flow.from) || troubled(flow.to);
    }
    ++n_told;
    if (flows.empty() || follows) continue;
    const std::span<const std::size_t> others = std::span(flows).subspan(1);
    fault(case_.flows[flows.front()].pointer,
          fmt::format("the flow from {} is left open", flow_name(flows.front())),
          others.empty()
              ? "continuity must fix every flow that is not given"
              : fmt::format("continuity must fix every flow that is not given, and this one can "
                            "change together with {}",
                            flow_list(others)),
          others.empty() ? "Give its \"flow\" or \"share\"."
                         : "Give the \"flow\" or \"share\" of one of them.");
  }
  if (n_free > n_told && n_found_ > 0) {
    fault("/flows", fmt::format("{} more flows are left open", n_free - n_told),
          "continuity must fix every flow that is not given", "Give more flows or shares.");
  }
}

void FlowChecks::contradictions(const FlowEquations& equations, const FlowSystem& system,
                                std::span<const double> x, const std::string& when) {
  const std::size_t n_before = n_found_;
  unbalanced_groups(equations, x, when);
  if (n_found_ == n_before) missed_rows(equations, system, x, when);
}

/// Places joined by flows that are not given form a group. A group that no open flow joins to an
/// outlet has all its water in and out given: they must be equal. Exchanges that may drift join
/// too.
void FlowChecks::unbalanced_groups(const FlowEquations& equations, std::span<const double> x,
                                   const std::string& when) {
  const PlaceNumbering number(case_);
  const std::size_t outside = case_.zones.size() + case_.feeds.size();
  const auto node_of = [&](Place place) {
    return place.kind == Place::Kind::outlet ? outside : number.of(place);
  };
  std::vector<Link> links;
  for (const Flow& flow : case_.flows) {
    if (!flow.exchange && !flow.given) links.push_back({node_of(flow.from), node_of(flow.to)});
  }
  for (const std::size_t i : equations.drifting) {
    links.push_back({case_.flows[i].from.index, case_.flows[i].to.index});
  }
  const auto group_of = ZoneGraph(outside + 1, links).parts();
  struct Group {
    double in = 0.0;
    double out = 0.0;
    std::vector<Place> places;
    std::vector<std::size_t> given;
    bool follows = false;
  };
  std::vector<Group> groups(*std::ranges::max_element(group_of) + 1);
  const auto join = [&](Place place) {
    Group& group = groups[group_of[number.of(place)]];
    group.places.push_back(place);
    group.follows = group.follows || troubled(place);
  };
  for (std::size_t z = 0; z < case_.zones.size(); ++z) join({Place::Kind::zone, z});
  for (std::size_t f = 0; f < case_.feeds.size(); ++f) {
    join({Place::Kind::feed, f});
    groups[group_of[case_.zones.size() + f]].in += x[equations.feed_rate(f)];
  }
  for (std::size_t i = 0; i < case_.flows.size(); ++i) {
    const Flow& flow = case_.flows[i];
    const std::size_t from = group_of[node_of(flow.from)];
    const std::size_t to = group_of[node_of(flow.to)];
    if (flow.exchange || !flow.given || from == to) continue;
    groups[from].out += x[i];
    groups[from].given.push_back(i);
    groups[to].in += x[i];
    groups[to].given.push_back(i);
  }
  for (std::size_t g = 0; g < groups.size(); ++g) {
    const Group& group = groups[g];
    if (g == group_of[outside] || group.follows) continue;
    if (std::abs(group.in - group.out) <= kAgreement * std::max(group.in, group.out)) continue;
    tell_unbalanced(group.places, group.in, group.out, group.given, when);
  }
}

void FlowChecks::tell_unbalanced(std::span<const Place> places, double in, double out,
                                 std::span<const std::size_t> given, const std::string& when) {
  std::string zones;
  std::string feeds;
  std::size_t n_zones = 0;
  for (const Place place : places) {
    if (place.kind == Place::Kind::feed) {
      feeds += fmt::format("{}\"{}\"", feeds.empty() ? "" : ", ", case_.name_of(place));
    } else if (++n_zones <= kMostListed) {
      zones += fmt::format("{}\"{}\"", zones.empty() ? "" : ", ", case_.name_of(place));
    }
  }
  if (n_zones > kMostListed) zones += fmt::format(" and {} more", n_zones - kMostListed);
  std::string found;
  if (n_zones == 0) {
    found =
        fmt::format("feed {} brings {} and its flows take {}{}", feeds, rate(in), rate(out), when);
  } else if (n_zones == 1) {
    found = fmt::format("zone {} takes in {} and gives off {}{}", zones, rate(in), rate(out), when);
  } else {
    found = fmt::format("zones {} together take in {} and give off {}{}", zones, rate(in),
                        rate(out), when);
  }
  std::string way_out = "Add a flow out.";
  if (!given.empty()) {
    way_out = fmt::format("Change one of the given flows, or leave its \"flow\" out: {}",
                          flow_list(given));
    way_out += feeds.empty() ? "." : fmt::format("; or change the flow of feed {}.", feeds);
  }
  fault(pointer_of(case_, places.front()), std::move(found), "what flows in must flow out",
        std::move(way_out));
}

void FlowChecks::missed_rows(const FlowEquations& equations, const FlowSystem& system,
                             std::span<const double> x, const std::string& when) {
  using Kind = FlowEquations::Meaning::Kind;
  double largest = 0.0;
  for (std::size_t i = 0; i < equations.n_flows; ++i) largest = std::max(largest, std::abs(x[i]));
  std::set<Place> told;
  for (std::size_t r = 0; r < equations.rows.size(); ++r) {
    if (system.relative_residual(r, x, 1e-12 * largest) <= kAgreement) continue;
    const FlowEquations::Meaning& meaning = equations.meanings[r];
    if (meaning.kind == Kind::drift) continue;
    Place place{Place::Kind::zone, meaning.index};
    if (meaning.kind == Kind::feed) place.kind = Place::Kind::feed;
    if (meaning.kind == Kind::share) place = case_.flows[meaning.index].from;
    if (troubled(place) || !told.insert(place).second) continue;
    std::vector<std::size_t> touching = place.kind == Place::Kind::feed
                                            ? equations.out_of_feed[place.index]
                                            : equations.out_of_zone[place.index];
    double out = 0.0;
    for (const std::size_t i : touching) out += x[i];
    double in = 0.0;
    if (place.kind == Place::Kind::feed) {
      in = x[equations.feed_rate(place.index)];
    } else {
      for (const std::size_t i : equations.into_zone[place.index]) {
        in += x[i];
        touching.push_back(i);
      }
      for (const std::size_t i : equations.drifting) {
        if (case_.flows[i].from == place) in -= x[equations.drift(i)];
        if (case_.flows[i].to == place) in += x[equations.drift(i)];
      }
    }
    const bool differ = std::abs(in - out) > kAgreement * std::max(in, out);
    const std::string numbers = fmt::format(": {} in, {} out", rate(in), rate(out));
    std::erase_if(touching,
                  [&](std::size_t i) { return !case_.flows[i].given && !case_.flows[i].share; });
    fault(pointer_of(case_, place),
          fmt::format("the flows and shares given at \"{}\" contradict each other{}{}",
                      case_.name_of(place), differ ? numbers : "", when),
          "what flows in must flow out, in the shares given",
          touching.empty() ? "Change a given flow upstream of it."
                           : fmt::format("Change one of them, or leave its \"flow\" or \"share\" "
                                         "out: {}.",
                                         flow_list(touching)));
  }
}

void FlowChecks::negatives(const FlowEquations& equations, std::span<const double> x,
                           const std::string& when) {
  double scale = 0.0;
  for (std::size_t i = 0; i < equations.n_flows; ++i) scale = std::max(scale, std::abs(x[i]));
  for (std::size_t i = 0; i < equations.n_flows; ++i) {
    const Flow& flow = case_.flows[i];
    if (flow.exchange || x[i] >= -1e-9 * scale || !negative_.insert(i).second) continue;
    const bool turns = flow.from.kind == Place::Kind::zone && flow.to.kind == Place::Kind::zone;
    std::vector<std::size_t> given;
    const auto collect = [&](Place place) {
      if (place.kind == Place::Kind::outlet) return;
      const auto& leaving = place.kind == Place::Kind::feed ? equations.out_of_feed[place.index]
                                                            : equations.out_of_zone[place.index];
      given.insert(given.end(), leaving.begin(), leaving.end());
      if (place.kind == Place::Kind::zone) {
        const auto& entering = equations.into_zone[place.index];
        given.insert(given.end(), entering.begin(), entering.end());
      }
    };
    collect(flow.from);
    collect(flow.to);
    std::erase_if(given, [&](std::size_t other) { return !case_.flows[other].given; });
    std::ranges::sort(given);
    given.erase(std::unique(given.begin(), given.end()), given.end());
    std::string way_out;
    if (turns && (when.empty() || when == kOnAverage))
      way_out = "Swap \"from\" and \"to\" to turn it round";
    if (!given.empty()) {
      way_out += fmt::format("{} one of the given flows beside it: {}",
                             way_out.empty() ? "Change" : ", or change", flow_list(given));
    }
    if (way_out.empty()) way_out = "Change the flows it depends on";
    fault(flow.pointer,
          fmt::format("the flow from {} comes out at {}{}", flow_name(i), rate(x[i]), when),
          "a one-way flow must be >= 0", way_out + ".");
  }
}

}  // namespace stillzone::network
