#pragma once

#include <cstddef>
#include <vector>

#include "network/snapshot.hpp"
#include "network/washout/load_curve.hpp"
#include "network/washout/loaded_digester.hpp"

namespace stillzone::network {

/// Turns states of a digester under load into points of its curve.
class CurveValues {
 public:
  /// All must outlive this object.
  CurveValues(const Case& the_case, LoadedDigester& loaded, std::size_t most_unknowns);

  /// The digester is set to `load`.
  [[nodiscard]] CurvePoint point(std::span<const double> y, double load);
  /// Whether each group lives (see name_state). The digester is set to `load`.
  [[nodiscard]] std::vector<bool> living(std::span<const double> y, double load);
  /// Mean over all zones of a component, by volume.
  [[nodiscard]] double mean_of(std::span<const double> y, std::size_t component) const;

 private:
  void read_outlets(const Snapshot& snapshot, CurvePoint& point) const;

  const Case& case_;
  LoadedDigester& loaded_;
  SnapshotMaker snapshots_;
  std::size_t most_unknowns_;
  double volume_ = 0.0;
};

}  // namespace stillzone::network
