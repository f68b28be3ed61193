#include "network/tracer/water_network.hpp"

#include <algorithm>
#include <cmath>
#include <unsupported/Eigen/MatrixFunctions>
#include <utility>

namespace stillzone::network {
namespace {

using Eigen::Index;
using Eigen::MatrixXd;
using Eigen::VectorXd;

Index index_of(const Place& place) { return static_cast<Index>(place.index); }

/// In minus out of every zone [m3/d].
VectorXd imbalance(std::span<const Stream> streams, std::span<const double> rates,
                   std::size_t n_zones) {
  VectorXd net = VectorXd::Zero(static_cast<Index>(n_zones));
  for (std::size_t s = 0; s < streams.size(); ++s) {
    if (streams[s].from.kind == Place::Kind::zone) net[index_of(streams[s].from)] -= rates[s];
    if (streams[s].to.kind == Place::Kind::zone) net[index_of(streams[s].to)] += rates[s];
  }
  return net;
}

double largest(std::span<const double> rates) {
  double most = 0.0;
  for (const double rate : rates) most = std::max(most, std::abs(rate));
  return most;
}

}  // namespace

WaterNetwork::WaterNetwork(const Case& the_case, const FlowBalance& balance,
                           std::vector<WaterQuantity> quantities)
    : water_(water_of(the_case)),
      streams_(balance.streams().begin(), balance.streams().end()),
      quantities_(std::move(quantities)) {}

WaterSystem::Part WaterNetwork::part_of(const Case& water, std::span<const double> rates) const {
  const auto n_zones = static_cast<Index>(water.zones.size());
  const auto n_feeds = static_cast<Index>(water.feeds.size());
  const auto n_outlets = static_cast<Index>(water.outlets.size());
  WaterSystem::Part part{.transport = MatrixXd::Zero(n_zones, n_zones),
                         .volume = VectorXd::Zero(n_zones),
                         .feed_to_zone = MatrixXd::Zero(n_feeds, n_zones),
                         .feed_to_outlet = MatrixXd::Zero(n_feeds, n_outlets),
                         .zone_to_outlet = MatrixXd::Zero(n_zones, n_outlets),
                         .feed = VectorXd::Zero(n_feeds),
                         .outlet = VectorXd::Zero(n_outlets)};
  // First the flows themselves; the caller divides by volumes.
  for (std::size_t s = 0; s < streams_.size(); ++s) {
    const Place& from = streams_[s].from;
    const Place& to = streams_[s].to;
    if (from.kind == Place::Kind::feed) part.feed[index_of(from)] += rates[s];
    if (to.kind == Place::Kind::outlet) part.outlet[index_of(to)] += rates[s];
    if (from.kind == Place::Kind::zone) {
      part.transport(index_of(from), index_of(from)) -= rates[s];
      if (to.kind == Place::Kind::zone) part.transport(index_of(to), index_of(from)) += rates[s];
      if (to.kind == Place::Kind::outlet) {
        part.zone_to_outlet(index_of(from), index_of(to)) += rates[s];
      }
    } else if (to.kind == Place::Kind::zone) {
      part.feed_to_zone(index_of(from), index_of(to)) += rates[s];
    } else {
      part.feed_to_outlet(index_of(from), index_of(to)) += rates[s];
    }
  }
  return part;
}

std::optional<WaterSystem> WaterNetwork::system(std::span<const double> values) const {
  Case water = water_of(water_);
  for (std::size_t j = 0; j < quantities_.size(); ++j) {
    set_water_quantity(water, quantities_[j], values[j]);
  }
  const RateSlopes flows = rate_slopes(water, streams_, quantities_);
  const double scale = largest(flows.rates);
  if (std::ranges::any_of(flows.rates, [&](double rate) { return rate < -1e-12 * scale; }) ||
      imbalance(streams_, flows.rates, water.zones.size()).cwiseAbs().maxCoeff() > 1e-9 * scale) {
    return std::nullopt;
  }
  WaterSystem system;
  system.at = part_of(water, flows.rates);
  for (std::size_t z = 0; z < water.zones.size(); ++z) {
    system.at.volume[static_cast<Index>(z)] = water.zones[z].volume.value();
  }
  const MatrixXd exchanged = system.at.transport;  // [m3/d]
  const VectorXd per_volume = system.at.volume.cwiseInverse();
  system.at.transport = per_volume.asDiagonal() * exchanged;
  for (std::size_t j = 0; j < quantities_.size(); ++j) {
    WaterSystem::Part slope = part_of(water, flows.slopes[j]);
    slope.transport = (per_volume.asDiagonal() * slope.transport).eval();
    if (quantities_[j].kind == WaterQuantity::Kind::zone_volume) {
      const auto z = static_cast<Index>(quantities_[j].index);
      slope.volume[z] = 1.0;
      slope.transport.row(z) -= system.at.transport.row(z) * per_volume[z];
    }
    system.slope.push_back(std::move(slope));
  }
  return system;
}

std::vector<std::size_t> WaterNetwork::breaking_continuity() const {
  const RateSlopes flows = rate_slopes(water_, streams_, quantities_);
  std::vector<std::size_t> breaking;
  for (std::size_t j = 0; j < quantities_.size(); ++j) {
    const double scale = largest(flows.slopes[j]);
    if (imbalance(streams_, flows.slopes[j], water_.zones.size()).cwiseAbs().maxCoeff() >
        1e-9 * scale) {
      breaking.push_back(j);
    }
  }
  return breaking;
}

DoseHistory::DoseHistory(const WaterSystem& system, const Injection& injection,
                         const NetworkDose& dose, bool with_slopes)
    : system_(system),
      injection_(injection),
      rate_(dose.rate),
      until_(dose.until),
      with_slopes_(with_slopes) {
  const Index n = system.at.volume.size();
  const auto n_quantities = static_cast<Index>(with_slopes ? system.slope.size() : 0);
  const auto place = static_cast<Index>(injection.index);
  const auto share_of = [&](Index z) {
    if (injection.kind == Injection::Kind::zone) return z == place ? 1.0 : 0.0;
    return system.at.feed_to_zone(place, z) / system.at.feed[place];
  };
  entry_.resize(n);
  entry_slope_.resize(n, n_quantities);
  for (Index z = 0; z < n; ++z) {
    const double volume = system.at.volume[z];
    entry_[z] = share_of(z) / volume;
    for (Index j = 0; j < n_quantities; ++j) {
      const WaterSystem::Part& slope = system.slope[static_cast<std::size_t>(j)];
      double by_share = 0.0;
      if (injection.kind == Injection::Kind::feed) {
        by_share = (slope.feed_to_zone(place, z) - share_of(z) * slope.feed[place]) /
                   system.at.feed[place];
      }
      entry_slope_(z, j) = (by_share - entry_[z] * slope.volume[z]) / volume;
    }
  }
  zones_ = dose.mass * entry_;
  slopes_ = dose.mass * entry_slope_;
  rate_slope_ = VectorXd::Zero(n_quantities);
  if (dose.concentration > 0.0) {
    rate_ = dose.concentration * system.at.feed[place];
    for (Index j = 0; j < n_quantities; ++j) {
      rate_slope_[j] = dose.concentration * system.slope[static_cast<std::size_t>(j)].feed[place];
    }
  }
}

void DoseHistory::propagate(double span, bool dosing) {
  const Index n = zones_.size();
  const MatrixXd& a = system_.at.transport;
  const double rate = dosing ? rate_ : 0.0;
  if (!with_slopes_ || slopes_.cols() == 0) {
    MatrixXd block = MatrixXd::Zero(n + 1, n + 1);
    block.topLeftCorner(n, n) = a * span;
    block.topRightCorner(n, 1) = entry_ * (rate * span);
    const MatrixXd moved = block.exp();
    zones_ = (moved.topLeftCorner(n, n) * zones_ + moved.topRightCorner(n, 1)).eval();
    return;
  }
  VectorXd zones = zones_;
  for (Index j = 0; j < slopes_.cols(); ++j) {
    const MatrixXd& by_quantity = system_.slope[static_cast<std::size_t>(j)].transport;
    MatrixXd block = MatrixXd::Zero(2 * n + 1, 2 * n + 1);
    block.topLeftCorner(n, n) = a * span;
    block.block(n, n, n, n) = a * span;
    block.block(n, 0, n, n) = by_quantity * span;
    block.block(0, 2 * n, n, 1) = entry_ * (rate * span);
    if (dosing) {
      block.block(n, 2 * n, n, 1) = (entry_slope_.col(j) * rate + entry_ * rate_slope_[j]) * span;
    }
    const MatrixXd moved = block.exp();
    VectorXd start(2 * n + 1);
    start << zones_, slopes_.col(j), 1.0;
    const VectorXd end = moved * start;
    zones = end.head(n);
    slopes_.col(j) = end.segment(n, n);
  }
  zones_ = zones;
}

void DoseHistory::advance(double time) {
  if (dosing_at(time_) && time > until_) {
    propagate(until_ - time_, true);
    time_ = until_;
  }
  if (time > time_) propagate(time - time_, dosing_at(time_));
  time_ = std::max(time_, time);
}

/// What the feed carries straight to an outlet just now [g/d].
double DoseHistory::bypass_numerator(std::size_t outlet) const {
  if (injection_.kind != Injection::Kind::feed || !dosing_at(time_)) return 0.0;
  const Index f = to_index(injection_.index);
  return rate_ * system_.at.feed_to_outlet(f, to_index(outlet)) / system_.at.feed[f];
}

double DoseHistory::outlet(std::size_t index) const {
  const Index o = to_index(index);
  return (system_.at.zone_to_outlet.col(o).dot(zones_) + bypass_numerator(index)) /
         system_.at.outlet[o];
}

double DoseHistory::outlet_slope(std::size_t index, std::size_t quantity) const {
  const Index o = to_index(index);
  const WaterSystem::Part& slope = system_.slope[quantity];
  double numerator = slope.zone_to_outlet.col(o).dot(zones_) +
                     system_.at.zone_to_outlet.col(o).dot(slopes_.col(to_index(quantity)));
  if (injection_.kind == Injection::Kind::feed && dosing_at(time_)) {
    const Index f = to_index(injection_.index);
    numerator += (rate_ * slope.feed_to_outlet(f, o) +
                  rate_slope_[to_index(quantity)] * system_.at.feed_to_outlet(f, o) -
                  bypass_numerator(index) * slope.feed[f]) /
                 system_.at.feed[f];
  }
  return (numerator - outlet(index) * slope.outlet[o]) / system_.at.outlet[o];
}

}  // namespace stillzone::network
