#include "network/tracer/network_model.hpp"

#include <fmt/format.h>

#include <algorithm>
#include <cmath>
#include <limits>
#include <numeric>
#include <optional>
#include <utility>

#include "core/near_name.hpp"
#include "network/flow_equations.hpp"
#include "network/tracer/network_residence.hpp"
#include "network/tracer/water_network.hpp"

namespace stillzone::network {
namespace {

/// Where samples are taken in the case.
struct SamplePlace {
  bool outlet = true;
  std::size_t index = 0;
};

/// The dose at the test's mean flow, in days.
NetworkDose dose_in_days(const TracerTest& test, double days_per_turnover) {
  const DoseInTurnovers dose = dose_in_turnovers(test);
  if (dose.kind == DoseInTurnovers::Kind::step) {
    return {.concentration = dose.strength, .until = std::numeric_limits<double>::infinity()};
  }
  const double mass = dose.strength * test.volume.value();
  const double length = dose.length * days_per_turnover;
  if (!(length > 0.0)) return {.mass = mass};
  return {.rate = mass / length, .until = length};
}

class NetworkModel final : public TracerModel {
 public:
  NetworkModel(std::string name, std::shared_ptr<const WaterNetwork> network,
               const Injection& injection, std::vector<SamplePlace> places, const TracerTest& test,
               std::vector<RtdParameter> parameters)
      : name_(std::move(name)),
        network_(std::move(network)),
        injection_(injection),
        places_(std::move(places)),
        days_(test.volume.value() / test.mean_flow.value()),
        dose_(dose_in_days(test, days_)),
        parameters_(std::move(parameters)),
        residence_(network_residence(network_,
                                     injection.kind == Injection::Kind::feed ? injection.index : 0,
                                     days_, name_, parameters_)) {}

  [[nodiscard]] std::string name() const override { return name_; }
  [[nodiscard]] std::string meaning() const override { return network_->water().title; }
  [[nodiscard]] std::string source() const override { return "the user's own network"; }
  [[nodiscard]] std::span<const RtdParameter> parameters() const override { return parameters_; }
  [[nodiscard]] const RtdModel& residence() const override { return *residence_; }

  [[nodiscard]] bool sees(const SamplingPoint& /*point*/) const override { return true; }
  [[nodiscard]] bool predict(std::span<const double> p, std::span<const SamplePosition> positions,
                             std::span<double> values, std::span<double> gradient) const override {
    const auto system = network_->system(p);
    if (!system) return false;
    const bool slopes = !gradient.empty();
    DoseHistory history(*system, injection_, dose_, slopes);
    std::vector<std::size_t> order(positions.size());
    std::iota(order.begin(), order.end(), std::size_t{0});
    std::ranges::stable_sort(order, [&](std::size_t a, std::size_t b) {
      return positions[a].theta < positions[b].theta;
    });
    for (const std::size_t i : order) {
      history.advance(positions[i].theta * days_);
      const SamplePlace& place = places_[positions[i].point];
      values[i] = place.outlet ? history.outlet(place.index) : history.zone(place.index);
      for (std::size_t j = 0; slopes && j < p.size(); ++j) {
        gradient[i * p.size() + j] = place.outlet ? history.outlet_slope(place.index, j)
                                                  : history.zone_slope(place.index, j);
      }
    }
    return true;
  }

 private:
  std::string name_;
  std::shared_ptr<const WaterNetwork> network_;
  Injection injection_;
  std::vector<SamplePlace> places_;
  double days_;  ///< per turnover
  NetworkDose dose_;
  std::vector<RtdParameter> parameters_;
  std::unique_ptr<const RtdModel> residence_;
};

template <class Named>
std::optional<std::size_t> number_of(const std::vector<Named>& all, const std::string& name) {
  const auto found = std::ranges::find(all, name, &Named::name);
  if (found == all.end()) return std::nullopt;
  return static_cast<std::size_t>(found - all.begin());
}

/// Binds a test to a case, fault by fault.
class Binding {
 public:
  Binding(const Case& the_case, const core::JsonDocument& document, const TracerTest& test,
          core::FaultList& faults)
      : case_(the_case), document_(document), test_(test), faults_(faults) {}

  std::optional<Injection> injection() {
    const std::string& into = test_.dose_into;
    const bool step = std::holds_alternative<StepDose>(test_.dose);
    if (const auto feed = number_of(case_.feeds, into)) {
      return Injection{.kind = Injection::Kind::feed, .index = *feed};
    }
    if (into == "feed" && case_.feeds.size() == 1) return Injection{};
    if (into == "feed") {
      refuse("/feeds", fmt::format("{} feeds", case_.feeds.size()),
             "the test doses \"into\": \"feed\", which is clear with one feed only",
             "Name the dosed feed in the test: \"into\": \"" + case_.feeds.front().name + "\".");
      return std::nullopt;
    }
    if (const auto zone = number_of(case_.zones, into); zone && !step) {
      return Injection{.kind = Injection::Kind::zone, .index = *zone};
    }
    refuse("", fmt::format("no {} \"{}\"", step ? "feed" : "feed or zone", into),
           "the test's dose must enter a place of this case",
           "Change \"into\" in the test's \"dose\", or the names in this case.");
    return std::nullopt;
  }

  std::optional<std::vector<SamplePlace>> places() {
    std::vector<SamplePlace> places;
    std::vector<std::string> names;
    for (const Outlet& outlet : case_.outlets) names.push_back(outlet.name);
    for (const Zone& zone : case_.zones) names.push_back(zone.name);
    for (const SamplingPoint& point : test_.points) {
      if (const auto outlet = number_of(case_.outlets, point.at)) {
        places.push_back({true, *outlet});
      } else if (const auto zone = number_of(case_.zones, point.at)) {
        places.push_back({false, *zone});
      } else if (point.at == "outlet" && case_.outlets.size() == 1) {
        places.push_back({true, 0});
      } else {
        refuse("", fmt::format("no outlet or zone \"{}\"", point.at),
               "every sampling point of the test must be a place of this case",
               core::name_hint(point.at, names));
        return std::nullopt;
      }
    }
    return places;
  }

  /// The free quantities that move water; the others are named in remarks.
  struct Free {
    std::vector<WaterQuantity> quantities;
    std::vector<RtdParameter> parameters;
    std::vector<std::string> pointers;
  };
  Free free_quantities(std::vector<std::string>& remarks) {
    Free free;
    for (const core::FreeQuantity& quantity : case_.free_quantities) {
      if (!quantity.fit_low) continue;
      const auto water = water_quantity(case_, quantity.pointer);
      if (!water) {
        remarks.push_back(quantity.pointer +
                          " carries \"fit\" but no tracer can see it; kept at its value");
        continue;
      }
      if (water->kind == WaterQuantity::Kind::share && !leaves_a_rest(water->index)) {
        refuse(quantity.pointer, "a free share among shares that take everything",
               "the shares at one place must add up to 1 while this one changes",
               "Take the share off one of the other flows: it then carries what is left.");
        continue;
      }
      free.quantities.push_back(*water);
      free.pointers.push_back(quantity.pointer);
      free.parameters.push_back({.name = quantity.pointer,
                                 .unit = unit_of(*water),
                                 .meaning = meaning_of(*water),
                                 .start = quantity.value,
                                 .low = *quantity.fit_low,
                                 .high = *quantity.fit_high});
    }
    if (free.quantities.empty() && faults_.empty()) {
      refuse("", "nothing free that moves water",
             "a case among the \"models\" of a test has quantities to fit",
             "Write one as {\"value\": \"600 m3\", \"fit\": [\"100 m3\", \"1500 m3\"]}.");
    }
    return free;
  }

  void refuse(const std::string& pointer, std::string found, std::string allowed,
              std::string way_out) {
    faults_.add({.file = document_.name(),
                 .pointer = pointer,
                 .line = document_.line_of(pointer),
                 .found = std::move(found),
                 .allowed = std::move(allowed),
                 .way_out = std::move(way_out)});
  }

 private:
  static std::string unit_of(const WaterQuantity& quantity) {
    switch (quantity.kind) {
      case WaterQuantity::Kind::zone_volume:
        return "m3";
      case WaterQuantity::Kind::share:
        return "1";
      case WaterQuantity::Kind::flow:
      case WaterQuantity::Kind::feed_flow:
        break;
    }
    return "m3/d";
  }
  [[nodiscard]] std::string meaning_of(const WaterQuantity& quantity) const {
    const auto flow_between = [&](const Flow& flow) {
      return fmt::format("{} \"{}\" {} \"{}\"", flow.exchange ? "between" : "from",
                         case_.name_of(flow.from), flow.exchange ? "and" : "to",
                         case_.name_of(flow.to));
    };
    switch (quantity.kind) {
      case WaterQuantity::Kind::zone_volume:
        return "volume of zone \"" + case_.zones[quantity.index].name + "\"";
      case WaterQuantity::Kind::flow:
        return "flow " + flow_between(case_.flows[quantity.index]);
      case WaterQuantity::Kind::share:
        return "share of the flow " + flow_between(case_.flows[quantity.index]);
      case WaterQuantity::Kind::feed_flow:
        break;
    }
    return "flow of feed \"" + case_.feeds[quantity.index].name + "\"";
  }
  /// Some one-way flow leaves the same place without a share or a flow of its own.
  [[nodiscard]] bool leaves_a_rest(std::size_t flow) const {
    return std::ranges::any_of(case_.flows, [&](const Flow& other) {
      return !other.exchange && other.from == case_.flows[flow].from && !other.share;
    });
  }

  const Case& case_;
  const core::JsonDocument& document_;
  const TracerTest& test_;
  core::FaultList& faults_;
};

void compare_with_test(const Case& the_case, const TracerTest& test, const Binding::Free& free,
                       std::vector<std::string>& remarks) {
  double fed = 0.0;
  for (const Feed& feed : the_case.feeds) fed += feed.flow.value;
  const bool feed_is_free = std::ranges::any_of(free.quantities, [](const WaterQuantity& q) {
    return q.kind == WaterQuantity::Kind::feed_flow;
  });
  if (!feed_is_free && std::abs(fed - test.mean_flow.value()) > 0.01 * fed) {
    remarks.push_back(
        fmt::format("the case feeds {:.4g} m3/d, the test's mean flow is {:.4g} m3/d: they should "
                    "agree, or the feed's flow be free",
                    fed, test.mean_flow.value()));
  }
}

}  // namespace

std::optional<UserNetwork> bind_user_network(const core::JsonDocument& document,
                                             const std::string& name, const TracerTest& test,
                                             const core::UnitReader& units,
                                             core::FaultList& faults) {
  const std::size_t n_before = faults.all().size();
  const auto the_case = read_case(document, units, faults);
  if (!the_case) return std::nullopt;
  const auto balance = FlowBalance::solve(*the_case, document, faults);
  if (!balance) return std::nullopt;
  UserNetwork user;
  Binding binding(*the_case, document, test, faults);
  const auto injection = binding.injection();
  auto places = binding.places();
  Binding::Free free = binding.free_quantities(user.remarks);
  if (faults.all().size() > n_before || !injection || !places) return std::nullopt;
  compare_with_test(*the_case, test, free, user.remarks);
  auto network = std::make_shared<const WaterNetwork>(*the_case, *balance, free.quantities);
  for (const std::size_t j : network->breaking_continuity()) {
    binding.refuse(free.pointers[j], "a free quantity that continuity does not leave free",
                   "when it changes some other flow must be able to follow",
                   "Leave out \"flow\" on the flow that should take up the difference.");
  }
  if (faults.all().size() > n_before) return std::nullopt;
  user.model = std::make_unique<NetworkModel>(name, std::move(network), *injection,
                                              std::move(*places), test, free.parameters);
  return user;
}

std::optional<UserNetwork> load_user_network(const std::filesystem::path& path,
                                             const std::string& name, const TracerTest& test,
                                             const core::UnitReader& units,
                                             core::FaultList& faults) {
  const auto document = core::JsonDocument::read(path, faults);
  if (!document) return std::nullopt;
  return bind_user_network(*document, name, test, units, faults);
}

}  // namespace stillzone::network
