#pragma once

#include <cstddef>
#include <map>
#include <optional>
#include <span>
#include <vector>

#include "network/case.hpp"
#include "network/flow_balance.hpp"

namespace stillzone::network {

/// How a digester is operated between two switches: what flows where, and what the feeds carry.
struct OperatingPoint {
  std::vector<double> rates;       ///< [m3/d] one per stream of the flow balance
  std::vector<double> feed_state;  ///< n_feeds * n_components, model units, load included
  std::size_t kind = 0;            ///< number of the combination of schedule states

  [[nodiscard]] std::span<const double> feed(std::size_t index, std::size_t n_components) const {
    return std::span(feed_state).subspan(index * n_components, n_components);
  }
};

/// Follows the schedules and records of a case through time. Operating points are kept by their
/// combination of schedule states and record rows, so that a switch that was seen before costs a
/// look-up.
class Operation {
 public:
  enum class Mode {
    scheduled,  ///< schedules and records as they run
    mean,       ///< schedules at their mean, records at t = 0: the conditions of a steady state
  };
  /// Both must outlive this object.
  Operation(const Case& the_case, const FlowBalance& balance, Mode mode);

  /// What holds in the interval that starts at t; valid until the next call.
  [[nodiscard]] const OperatingPoint& at(double t);
  /// First time strictly after t at which anything used by a flow or feed switches.
  [[nodiscard]] std::optional<double> next_switch(double t) const;
  [[nodiscard]] Mode mode() const { return mode_; }
  [[nodiscard]] const FlowBalance& balance() const { return balance_; }

  /// Mean stream rates [m3/d] over [from, until], until > from.
  [[nodiscard]] std::vector<double> mean_rates(double from, double until);

 private:
  const Case& case_;
  const FlowBalance& balance_;
  Mode mode_;
  std::vector<const core::Timeline*> schedules_;  ///< used by a flow or feed
  std::vector<const core::Timeline*> records_;
  std::map<std::vector<double>, std::size_t> kinds_;
  std::map<std::vector<double>, OperatingPoint> points_;
};

}  // namespace stillzone::network
