#pragma once

#include <set>
#include <span>
#include <string>
#include <string_view>
#include <vector>

#include "core/fault.hpp"
#include "network/case.hpp"
#include "network/flow_equations.hpp"
#include "network/flow_system.hpp"

namespace stillzone::network {

/// The judgements of a flow balance: each looks at one thing that can be wrong, and says it in
/// words of the trade with the flows to add, drop or change. Used by flow_balance.cpp only.
class FlowChecks {
 public:
  FlowChecks(const Case& the_case, const core::JsonDocument& document, core::FaultList& faults)
      : case_(the_case), document_(document), faults_(faults) {}

  /// Zones no feed reaches, zones that reach no outlet, feeds and outlets nothing joins.
  /// @param carries one per flow: whether it can carry water at all
  void graph(const std::vector<bool>& carries);
  /// Shares over 1, or under 1 with nothing to take the rest.
  void shares(const FlowEquations& equations);
  /// Flows that continuity leaves open.
  void open_flows(const FlowEquations& equations, const FlowSystem& system);
  /// Groups of places whose given flows do not balance, then rows that the solution misses.
  /// @param x one per variable of the system
  void contradictions(const FlowEquations& equations, const FlowSystem& system,
                      std::span<const double> x, const std::string& when);
  /// Flows below 0. @param when "" or " while \"mixing\" is off"
  void negatives(const FlowEquations& equations, std::span<const double> x,
                 const std::string& when);

  [[nodiscard]] bool found_any() const { return n_found_ > 0; }

 private:
  void fault(const std::string& pointer, std::string found, std::string allowed,
             std::string way_out);
  [[nodiscard]] std::string flow_name(std::size_t flow) const;
  [[nodiscard]] std::string flow_list(std::span<const std::size_t> flows) const;
  [[nodiscard]] bool troubled(Place place) const { return troubled_.contains(place); }
  void unbalanced_groups(const FlowEquations& equations, std::span<const double> x,
                         const std::string& when);
  void tell_unbalanced(std::span<const Place> places, double in, double out,
                       std::span<const std::size_t> given, const std::string& when);
  void missed_rows(const FlowEquations& equations, const FlowSystem& system,
                   std::span<const double> x, const std::string& when);

  const Case& case_;
  const core::JsonDocument& document_;
  core::FaultList& faults_;
  std::set<Place> troubled_;  ///< places already found at fault: what follows from it is not said
  std::set<std::size_t> negative_;  ///< flows already found below 0
  std::size_t n_found_ = 0;
};

/// The `when` of a balance with every schedule at its mean.
constexpr std::string_view kOnAverage = " on average";

/// Pointer of a place in the case file.
[[nodiscard]] std::string pointer_of(const Case& the_case, Place place);

}  // namespace stillzone::network
