#pragma once

#include <cstddef>
#include <optional>
#include <string>
#include <vector>

#include "network/case.hpp"
#include "network/flow_system.hpp"

namespace stillzone::network {

/// The variables and rows of a case's flow balance.
///   feed f:   sum(flows out of f) = Q_f
///   zone z:   sum(one-way flows in) = sum(one-way flows out); with shares, both equal T_z
///   share:    q_i = share_i * T_z   or   q_i = share_i * Q_f
/// Exchanges move no net water and stay out. Variables: one per flow, one per feed (its rate,
/// known), one per zone (T_z, its throughflow; known and unused where no share leaves the zone).
struct FlowEquations {
  explicit FlowEquations(const Case& the_case);

  /// What a row of the system states.
  struct Meaning {
    enum class Kind { feed, zone_in_out, zone_in, zone_out, share };
    Kind kind = Kind::zone_in_out;
    std::size_t index = 0;  ///< of the feed, the zone, or the flow with the share
  };

  std::size_t n_flows = 0;
  std::size_t n_feeds = 0;
  std::vector<std::vector<std::size_t>> out_of_feed;  ///< one-way flows by the feed they leave
  std::vector<std::vector<std::size_t>> out_of_zone;
  std::vector<std::vector<std::size_t>> into_zone;
  std::vector<FlowSystem::Row> rows;
  std::vector<Meaning> meanings;  ///< one per row
  std::vector<bool> known;        ///< one per variable

  [[nodiscard]] std::size_t feed_rate(std::size_t feed) const { return n_flows + feed; }
  [[nodiscard]] std::size_t throughflow(std::size_t zone) const { return n_flows + n_feeds + zone; }
};

/// Sum of the shares that leave one place.
struct ShareSum {
  double sum = 0.0;
  std::size_t n_shares = 0;
  bool rest_possible = false;  ///< some flow without a share takes what is left
  /// Shares that take all there is must add up to 1, others to at most 1 (to 1e-6).
  [[nodiscard]] bool adds_up() const;
};
[[nodiscard]] ShareSum share_sum(const Case& the_case, const std::vector<std::size_t>& leaving);

/// The case's schedules and records at one instant.
struct SwitchState {
  double time = 0.0;            ///< [d]
  std::vector<double> factors;  ///< one per schedule
  std::vector<double> feeds;    ///< [m3/d] one per feed: the record, without schedule
  bool operator==(const SwitchState& other) const {
    return factors == other.factors && feeds == other.feeds;
  }
};
[[nodiscard]] SwitchState state_at(const Case& the_case, double t);
/// Mean factor of every schedule: over its period, or over the run (a year when it has no end).
[[nodiscard]] std::vector<double> schedule_means(const Case& the_case);

}  // namespace stillzone::network
