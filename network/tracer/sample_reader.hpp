#pragma once

#include <cmath>
#include <optional>

#include "core/json_reader.hpp"
#include "network/tracer/test_columns.hpp"
#include "network/tracer/tracer_test.hpp"

namespace stillzone::network {

/// Standard deviation of a value: an absolute part and one in proportion.
struct ErrorModel {
  double absolute = 0.0;  ///< [g/m3]
  double relative = 0.0;  ///< [1]
  [[nodiscard]] double at(double value) const { return std::hypot(absolute, relative * value); }
};
/// "error": "0.10 g/m3", "3 %", or both as a list. A fault when it is missing.
ErrorModel read_error(core::ObjectReader& reader);

/// Reads and cleans one entry of "samples": {"at", "csv", "time": {"column", "unit" | "dates",
/// "clock"}, "value": {"column", "unit"}, "error", "detection_limit"}.
///
/// Censored are values written "<0.02", "nd", "<LOD", or below the detection limit: known only to
/// be at most their limit. Rows without a time or value are left out. Samples of one time are
/// averaged, their error becomes sqrt(sum error^2)/n (of numbers; limits beside a number are
/// dropped, of limits alone the lowest is kept). Order is restored. Each such act is a note.
///
/// Error of a sample: absolute part and share of its value, as the root of the sum of squares. A
/// share alone would let small values weigh without bound: it is then taken of the detection limit
/// at least, or of 1 % of the largest value where no limit is stated.
std::optional<SamplingPoint> read_sampling_point(core::ObjectReader& reader, const TestClock& clock,
                                                 const TracerTest& test);

}  // namespace stillzone::network
