#pragma once

#include <optional>
#include <string>

#include "core/json_reader.hpp"
#include "network/tracer/sample_time.hpp"
#include "network/tracer/tracer_test.hpp"

namespace stillzone::network {

/// How the times of one test are written: elapsed ("0 d") or dates ("2026-03-02 08:00"). Where they
/// are dates, model time 0 is the dose.
class TestClock {
 public:
  /// "at" of a dose: "0 d" or a date and time. @return [d] of model time.
  std::optional<double> read_start(core::ObjectReader& dose);
  [[nodiscard]] bool dated() const { return dated_; }
  /// [d] since 1970 of model time 0; only when dated().
  [[nodiscard]] double epoch() const { return epoch_; }

 private:
  bool dated_ = false;
  double epoch_ = 0.0;
};

/// Reads and cleans one entry of "samples": {"at", "csv", "time": {"column", "unit" | "dates"},
/// "value": {"column", "unit"}, "error", "detection_limit"}. Values written "<0.02", or below the
/// detection limit, are censored. Rows without a time or value are left out, duplicates averaged,
/// order restored; each such act is a note.
std::optional<SamplingPoint> read_sampling_point(core::ObjectReader& reader, const TestClock& clock,
                                                 const TracerTest& test);

}  // namespace stillzone::network
