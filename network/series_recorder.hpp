#pragma once

#include <span>
#include <vector>

#include "network/case.hpp"
#include "network/run_result.hpp"
#include "network/snapshot.hpp"

namespace stillzone::network {

/// Times to record at [d]: from, every multiple of `every` after it, and until. Rising.
[[nodiscard]] std::vector<double> record_times(double from, double until, double every);

/// Gathers the history of a run: of each zone every component, implicit unknown and derived
/// quantity; of each outlet its flow and the same; of each headspace gases, pressure and gas flows;
/// of each feed its flow. At a switch the flows shown are those that hold from then on.
class SeriesRecorder {
 public:
  /// All must outlive this object.
  SeriesRecorder(const Case& the_case, DigesterSystem& system, SnapshotMaker& snapshots);

  void record(double t, std::span<const double> y);
  [[nodiscard]] Series take() { return std::move(series_); }

 private:
  void add_columns();

  const Case& case_;
  DigesterSystem& system_;
  SnapshotMaker& snapshots_;
  Series series_;
};

}  // namespace stillzone::network
