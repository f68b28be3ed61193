#pragma once

#include <optional>
#include <string>
#include <vector>

#include "network/case.hpp"
#include "network/flow_balance.hpp"
#include "network/flow_solution.hpp"
#include "network/operation.hpp"

namespace stillzone::network {

/// The mean flows of a case under another load: every feed's flow times `load`, its concentrations
/// kept, so that the hydraulic retention time falls as 1 / load. Flows found by continuity or share
/// follow. Of the flows given in the case, those that leave a feed or enter an outlet carry feed
/// water and scale with it; exchanges and flows from zone to zone (mixers, returns) stay as they
/// are, unless continuity then fails (a given flow on the feed's only way through): then every
/// given one-way flow scales.
class LoadFlows {
 public:
  /// @return none when no such scaling keeps the water balance at half and twice the load
  [[nodiscard]] static std::optional<LoadFlows> of(const Case& the_case,
                                                   const FlowBalance& balance);

  /// Rates at a load > 0, feed states of today. A rate can come out negative when a given flow
  /// exceeds what a small load brings: see negative_below.
  [[nodiscard]] OperatingPoint at(double load) const;
  /// d(rates)/d(load), feed states of today. Exact; at a load where an exchange's drift turns
  /// round, that of the larger load.
  [[nodiscard]] OperatingPoint derivative(double load) const;
  /// Whether every rate is >= 0.
  [[nodiscard]] bool possible(double load) const;
  /// What scales and what stays, in words, for the output.
  [[nodiscard]] const std::string& rule() const { return rule_; }

 private:
  LoadFlows(const Case& the_case, const FlowBalance& balance, bool zones_too);
  [[nodiscard]] std::vector<double> stream_values(double load, bool derivative) const;
  [[nodiscard]] bool balances(double load) const;

  const Case* case_;
  const FlowBalance* balance_;
  OperatingPoint today_;
  std::vector<double> fixed_;                      ///< all flow variables: the part that stays
  std::vector<double> growing_;                    ///< the part in proportion to load
  std::vector<std::optional<std::size_t>> drift_;  ///< one per stream of an exchange
  std::vector<double> direction_;                  ///< of the drift, one per stream
  std::string rule_;
};

}  // namespace stillzone::network
