#pragma once

#include <map>
#include <optional>
#include <string>
#include <vector>

#include "core/index.hpp"
#include "core/json_document.hpp"
#include "core/json_reader.hpp"
#include "core/quantity.hpp"
#include "core/timeline.hpp"
#include "kinetics/kinetic_model.hpp"
#include "network/joint_spread.hpp"

namespace stillzone::network {

using ZoneIndex = core::Index<struct ZoneTag>;
using HeadspaceIndex = core::Index<struct HeadspaceTag>;
using FeedIndex = core::Index<struct FeedTag>;
using OutletIndex = core::Index<struct OutletTag>;
using ScheduleIndex = core::Index<struct ScheduleTag>;
using FlowIndex = core::Index<struct FlowTag>;

/// How a zone exchanges gas: with which headspace, how fast.
struct GasTransfer {
  HeadspaceIndex to;
  core::Rate coefficient;  ///< kLa
};

struct Zone {
  std::string name;
  core::Volume volume;  ///< of liquid, > 0
  core::Temperature temperature;
  std::optional<GasTransfer> gas;
};

/// Gas leaves at coefficient x (P - back - opening), at headspace conditions, one way only.
struct GasPipe {
  core::GasConductance coefficient;
  core::Pressure back_pressure;
  core::Pressure opening_pressure;
};

struct Headspace {
  std::string name;
  core::Volume volume;
  core::Temperature temperature;  ///< the case's, unless given
  GasPipe pipe;
};

/// A value that may follow a record. Without a record it is constant.
struct Recorded {
  double value = 0.0;  ///< internal (or model) unit; of the record, its first value
  std::optional<core::Timeline> record;
};

struct Feed {
  std::string name;
  Recorded flow;  ///< [m3/d]; with a schedule, the time mean
  std::optional<ScheduleIndex> schedule;
  std::vector<Recorded> state;  ///< one per model component, in its unit
  Recorded load{1.0, {}};       ///< factor on every component that carries COD
};

struct Outlet {
  std::string name;
};

struct Schedule {
  std::string name;
  core::Timeline timeline;
};

/// An end of a flow.
struct Place {
  enum class Kind { zone, feed, outlet };
  Kind kind = Kind::zone;
  std::size_t index = 0;
  auto operator<=>(const Place&) const = default;
};

/// One line of "flows": one-way ("from", "to") or an exchange ("between": both ways, same flow).
struct Flow {
  Place from;
  Place to;
  bool exchange = false;
  std::optional<core::FlowRate> given;  ///< "flow"; with a schedule, the flow while on
  std::optional<core::Share> share;     ///< of all one-way flow that leaves `from`
  std::optional<ScheduleIndex> schedule;
  std::string pointer;  ///< "/flows/3", for messages
};

struct RunSettings {
  enum class Kind { steady, periodic, dynamic };
  enum class Start { seeded, steady, given };
  Kind kind = Kind::steady;
  Start start = Start::seeded;
  /// start = given: place name -> component or gas name -> value; what is not named is 0.
  std::map<std::string, std::map<std::string, double>> given_start;
  core::Duration until;                  ///< dynamic only
  core::Duration record_every;           ///< dynamic only; default until / 500
  double tolerance = 1e-6;               ///< relative
  std::string integrator = "automatic";  ///< "automatic", "multistep", "one-step"
};

/// A case, validated, in internal units. Names are unique over zones, headspaces, feeds and
/// outlets.
struct Case {
  std::string title;
  core::Temperature temperature;
  kinetics::KineticModel kinetics;
  std::vector<Zone> zones;
  std::vector<Headspace> headspaces;
  std::vector<Feed> feeds;
  std::vector<Outlet> outlets;
  std::vector<Schedule> schedules;
  std::vector<Flow> flows;
  RunSettings run;
  std::vector<core::FreeQuantity> free_quantities;
  std::optional<JointSpread> joint_spread;
  std::vector<std::string> warnings;

  [[nodiscard]] const std::string& name_of(Place place) const;
};

/// Reads and validates a case document (contract: "stillzone": "case/1"). Nothing is returned when
/// there was a fault. Does not look at the flow balance (network/flow_balance.hpp).
[[nodiscard]] std::optional<Case> read_case(const core::JsonDocument& document,
                                            const core::UnitReader& units, core::FaultList& faults);

}  // namespace stillzone::network
