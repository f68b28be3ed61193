#pragma once

#include <array>
#include <cstddef>
#include <span>
#include <vector>

#include "network/case.hpp"
#include "network/flow_balance.hpp"
#include "network/operation.hpp"
#include "network/run_result.hpp"
#include "network/state_layout.hpp"

namespace stillzone::network {

/// What is conserved by true chemistry and counted by the ledger.
enum class Conserved { cod, carbon, nitrogen };
inline constexpr std::array kConserved = {Conserved::cod, Conserved::carbon, Conserved::nitrogen};

/// Bookkeeping of COD, carbon, nitrogen and water over a run, for the audit
///   in + made = liquid out + gas out + change of what is stored.
/// Its entries are amounts since the start [kg COD, kmol C, kmol N, m3]; their rates are linear in
/// the concentrations (gas: times the pipe's flow) and are integrated beside the state by the same
/// formula. Water vapour in the gas is not counted.
class Ledger {
 public:
  Ledger(const Case& the_case, std::span<const Stream> streams, const StateLayout& layout);

  enum class Entry { inflow, liquid_out, gas_out, made };
  [[nodiscard]] static constexpr std::size_t n_entries() { return 4 * kConserved.size() + 2; }
  [[nodiscard]] static constexpr std::size_t at(Conserved what, Entry entry) {
    return 4 * static_cast<std::size_t>(what) + static_cast<std::size_t>(entry);
  }
  static constexpr std::size_t kWaterIn = 4 * kConserved.size();
  static constexpr std::size_t kWaterOut = kWaterIn + 1;

  /// New rates and feed states.
  void set(const OperatingPoint& point);

  /// Rates of all entries but `made`, which are set to 0.
  /// @param pipe_flows [m3/d] at headspace conditions, one per headspace
  void rates(std::span<const double> y, std::span<const double> pipe_flows,
             std::span<double> g) const;
  /// The same along a direction v of y.
  /// @param pipe_flows_along [m3/d] derivative of the pipe flows along v
  void rates_along(std::span<const double> y, std::span<const double> v,
                   std::span<const double> pipe_flows, std::span<const double> pipe_flows_along,
                   std::span<double> gv) const;

  /// Content per unit of each component and of each gas.
  [[nodiscard]] std::span<const double> content(Conserved what) const;
  [[nodiscard]] std::span<const double> gas_content(Conserved what) const;

  /// Amount held in zones and headspaces.
  [[nodiscard]] double stored(Conserved what, std::span<const double> y) const;
  /// Closes the books: water, COD, C, N.
  /// @param entries integrated over the run (or rates, for a steady state: then the change of what
  ///   is stored is the rate `stored_after` - `stored_before`, both per day)
  [[nodiscard]] std::vector<Balance> balances(
      std::span<const double> entries, std::span<const double, kConserved.size()> stored_before,
      std::span<const double, kConserved.size()> stored_after) const;

 private:
  StateLayout layout_;
  std::vector<Stream> streams_;
  std::vector<double> volume_;            ///< [m3] zones
  std::vector<double> headspace_volume_;  ///< [m3]
  std::array<std::vector<double>, kConserved.size()> content_;
  std::array<std::vector<double>, kConserved.size()> gas_content_;
  std::vector<double> outflow_;  ///< [m3/d] from each zone to outlets
  std::array<double, kConserved.size()> inflow_{};
  std::array<double, kConserved.size()> bypass_{};  ///< from feeds straight to outlets
  double water_in_ = 0.0;
  double water_out_ = 0.0;
};

}  // namespace stillzone::network
