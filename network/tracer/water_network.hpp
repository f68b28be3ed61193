#pragma once

#include <Eigen/Dense>
#include <optional>
#include <span>
#include <vector>

#include "network/case.hpp"
#include "network/flow_balance.hpp"
#include "network/water_quantity.hpp"

namespace stillzone::network {

/// The water network of a case as a linear system, at one set of its free quantities:
///   dc/dt = A c + (what is dosed) / V,   A_zy = q_yz / V_z,  A_zz = -(sum q_z out) / V_z
/// with its derivative in each quantity.
struct WaterSystem {
  struct Part {
    Eigen::MatrixXd transport;       ///< A [1/d]
    Eigen::VectorXd volume;          ///< [m3]
    Eigen::MatrixXd feed_to_zone;    ///< n_feeds x n_zones [m3/d]
    Eigen::MatrixXd feed_to_outlet;  ///< n_feeds x n_outlets [m3/d]
    Eigen::MatrixXd zone_to_outlet;  ///< n_zones x n_outlets [m3/d]
    Eigen::VectorXd feed;            ///< n_feeds [m3/d]
    Eigen::VectorXd outlet;          ///< n_outlets [m3/d]
  };
  Part at;                  ///< the values
  std::vector<Part> slope;  ///< d / d quantity, one per quantity
};

/// Builds the system again for other values of the free quantities. Thread-safe.
class WaterNetwork {
 public:
  WaterNetwork(const Case& the_case, const FlowBalance& balance,
               std::vector<WaterQuantity> quantities);

  /// @param values internal units, one per quantity
  /// @return empty when a flow would be negative or the water balance does not close
  [[nodiscard]] std::optional<WaterSystem> system(std::span<const double> values) const;
  [[nodiscard]] const Case& water() const { return water_; }
  [[nodiscard]] std::size_t n_quantities() const { return quantities_.size(); }
  /// Quantities whose change breaks continuity, because too much else is given.
  [[nodiscard]] std::vector<std::size_t> breaking_continuity() const;

 private:
  [[nodiscard]] WaterSystem::Part part_of(const Case& water, std::span<const double> rates) const;

  Case water_;
  std::vector<Stream> streams_;
  std::vector<WaterQuantity> quantities_;
};

/// Something put into the network, per gram: where it enters and what passes it by.
struct Injection {
  enum class Kind { feed, zone };
  Kind kind = Kind::feed;
  std::size_t index = 0;
};

/// A dose of one kind; the others are 0.
struct NetworkDose {
  double mass = 0.0;           ///< [g] at once
  double rate = 0.0;           ///< [g/d] evenly from time 0 to `until`
  double concentration = 0.0;  ///< [g/m3] added to a feed from time 0 to `until`
  double until = 0.0;          ///< [d] infinite for a step
};

/// Concentrations of a dose in the network over time, exact by matrix exponentials, with
/// derivatives from the exponential of the block matrix [A 0; A' A] (Van Loan 1978, IEEE Trans.
/// Autom. Control 23:395).
class DoseHistory {
 public:
  DoseHistory(const WaterSystem& system, const Injection& injection, const NetworkDose& dose,
              bool with_slopes);

  /// Moves on to a later time [d].
  void advance(double time);

  [[nodiscard]] double time() const { return time_; }
  [[nodiscard]] double zone(std::size_t index) const { return zones_(to_index(index)); }
  [[nodiscard]] double zone_slope(std::size_t index, std::size_t quantity) const {
    return slopes_(to_index(index), to_index(quantity));
  }
  /// Flow-weighted concentration of an outlet [g/m3], what passes straight from the feed included.
  [[nodiscard]] double outlet(std::size_t index) const;
  [[nodiscard]] double outlet_slope(std::size_t index, std::size_t quantity) const;

 private:
  static Eigen::Index to_index(std::size_t i) { return static_cast<Eigen::Index>(i); }
  void propagate(double span, bool dosing);
  [[nodiscard]] bool dosing_at(double time) const { return rate_ > 0.0 && time < until_; }
  [[nodiscard]] double bypass_numerator(std::size_t outlet) const;

  const WaterSystem& system_;
  Injection injection_;
  double rate_;                 ///< [g/d]
  Eigen::VectorXd rate_slope_;  ///< per quantity; of a concentration, whose feed may be free
  double until_;
  bool with_slopes_;
  double time_ = 0.0;
  Eigen::VectorXd zones_;
  Eigen::MatrixXd slopes_;       ///< n_zones x n_quantities
  Eigen::VectorXd entry_;        ///< [1/m3] concentration rate per g/d dosed
  Eigen::MatrixXd entry_slope_;  ///< n_zones x n_quantities
};

}  // namespace stillzone::network
