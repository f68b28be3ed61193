#pragma once

#include <memory>
#include <optional>
#include <span>
#include <string>
#include <vector>

#include "core/fault.hpp"
#include "network/case.hpp"

namespace stillzone::network {

/// One directed stream of the balanced network (an exchange gives two). An exchange carries its
/// flow each way; where one-way flows alone cannot take the water on (feed -> a, a <-> b, b ->
/// outlet) the net flow that continuity needs runs on top, in the direction it needs.
struct Stream {
  Place from;
  Place to;
  std::size_t flow = 0;  ///< index into Case::flows
};

/// Flow rates of all streams as a linear function of what is given: continuity in every zone,
/// shares at every split. Built once per case; each combination of switch states then costs one
/// substitution.
class FlowBalance {
 public:
  /// Checks the graph and solves the balance at time 0 with schedules at their mean, then looks at
  /// the combinations of schedules and records that occur. Faults: a zone
  /// no feed reaches, a zone that reaches no outlet, flows continuity does not determine (naming
  /// which to add), flows given that contradict continuity (naming which to drop or change), a flow
  /// that comes out negative, shares that do not add up to 1 where nothing takes the rest.
  [[nodiscard]] static std::optional<FlowBalance> solve(const Case& the_case,
                                                        const core::JsonDocument& document,
                                                        core::FaultList& faults);

  /// In the order of Case::flows; an exchange gives from -> to, then to -> from.
  [[nodiscard]] std::span<const Stream> streams() const { return streams_; }
  /// What is odd but allowed: flows that carry nothing, states that were too many to check.
  [[nodiscard]] std::span<const std::string> warnings() const { return warnings_; }

  /// Stream rates [m3/d], size streams(), in the interval that starts at t.
  [[nodiscard]] std::vector<double> rates_at(const Case& the_case, double t) const;
  /// The same with every schedule at its mean over its period and records at time t.
  [[nodiscard]] std::vector<double> mean_rates(const Case& the_case, double t) const;
  /// Largest |in - out| over the zones, relative to the total feed (to the largest rate when
  /// nothing is fed).
  [[nodiscard]] double closure_error(const Case& the_case, std::span<const double> rates) const;

 private:
  struct Impl;
  std::vector<Stream> streams_;
  std::vector<std::string> warnings_;
  std::shared_ptr<const Impl> impl_;
};

}  // namespace stillzone::network
