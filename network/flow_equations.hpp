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
///   zone z:   sum(one-way flows in) + sum(drifts in) = sum(one-way flows out)
///             with shares, both sides equal T_z
///   share:    q_i = share_i * T_z   or   q_i = share_i * Q_f
///   drift:    n_e / E_e = p_a - p_b of an exchange E_e between zones a and b
///
/// Drift. An exchange moves E both ways and, where one-way flows alone cannot take the water on,
/// the net flow that continuity needs on top: a -> b carries E + n, b -> a carries E. It may drift
/// when one of its zones is not both fed and drained by one-way flows; elsewhere given flows must
/// balance by themselves. Where several routes of exchanges could carry the water it divides so
/// that sum(n_e^2 / E_e) is least, as in a network of pipes (p is the potential of that minimum).
///
/// Variables: one per flow (of an exchange: E, known), one per feed (its rate, known), one per zone
/// (T_z; known and unused where no share leaves it), one drift per flow and one potential per zone
/// (known and 0 where there is none).
struct FlowEquations {
  explicit FlowEquations(const Case& the_case);

  /// What a row of the system states.
  struct Meaning {
    enum class Kind { feed, zone_in_out, zone_in, zone_out, share, drift };
    Kind kind = Kind::zone_in_out;
    std::size_t index = 0;  ///< of the feed, the zone, or the flow
  };

  std::size_t n_flows = 0;
  std::size_t n_feeds = 0;
  std::vector<std::vector<std::size_t>> out_of_feed;  ///< one-way flows by the feed they leave
  std::vector<std::vector<std::size_t>> out_of_zone;
  std::vector<std::vector<std::size_t>> into_zone;
  std::vector<std::size_t> drifting;  ///< exchanges that may drift
  std::vector<bool> on_ring;   ///< one per flow: drifts and has other routes of drifting exchanges
  std::vector<double> share;   ///< one per flow, scaled to add up; 0 without a share
  std::vector<bool> by_share;  ///< one per flow: not given, a share (or the only rest) fixes it
  std::vector<FlowSystem::Row> rows;
  std::vector<Meaning> meanings;  ///< one per row
  std::vector<bool> known;        ///< one per variable

  [[nodiscard]] std::size_t feed_rate(std::size_t feed) const { return n_flows + feed; }
  [[nodiscard]] std::size_t throughflow(std::size_t zone) const { return n_flows + n_feeds + zone; }
  /// Net flow from `from` to `to` of an exchange.
  [[nodiscard]] std::size_t drift(std::size_t flow) const {
    return n_flows + n_feeds + out_of_zone.size() + flow;
  }
  [[nodiscard]] std::size_t potential(std::size_t zone) const {
    return 2 * n_flows + n_feeds + out_of_zone.size() + zone;
  }
  /// The flow whose rate or drift a variable is; none for other variables.
  [[nodiscard]] std::optional<std::size_t> flow_of(std::size_t variable) const;

 private:
  void collect_flows(const Case& the_case);
  void find_drifting(const Case& the_case);
  void find_rings(const Case& the_case);
  void add_flow(FlowSystem::Row& row, const Case& the_case, std::size_t flow, double factor) const;
  void add_drift(FlowSystem::Row& row, const Case& the_case, std::size_t flow, double factor) const;
  void add_zone_rows(const Case& the_case);
  void add_drift_rows(const Case& the_case);
  void scale_shares(const Case& the_case);
  bool add_share_rows(const Case& the_case, const std::vector<std::size_t>& leaving,
                      std::size_t total);
};

/// Whether each flow can carry water, as far as its own line says (not given as 0).
[[nodiscard]] std::vector<bool> carrying_by_itself(const Case& the_case);

/// Numbers the case's places: zones, then feeds, then outlets.
struct PlaceNumbering {
  explicit PlaceNumbering(const Case& the_case)
      : n_zones(the_case.zones.size()),
        n_feeds(the_case.feeds.size()),
        n_outlets(the_case.outlets.size()) {}
  std::size_t n_zones;
  std::size_t n_feeds;
  std::size_t n_outlets;
  [[nodiscard]] std::size_t of(Place place) const;
  [[nodiscard]] std::size_t n_places() const { return n_zones + n_feeds + n_outlets; }
  [[nodiscard]] std::vector<std::size_t> feeds() const;
  [[nodiscard]] std::vector<std::size_t> outlets() const;
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
