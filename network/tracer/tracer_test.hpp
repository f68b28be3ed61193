#pragma once

#include <optional>
#include <string>
#include <variant>
#include <vector>

#include "core/json_document.hpp"
#include "core/json_reader.hpp"
#include "core/quantity.hpp"
#include "core/timeline.hpp"

namespace stillzone::network {

/// One laboratory value, cleaned.
struct TracerSample {
  double time = 0.0;      ///< [d] since time zero of the test
  double value = 0.0;     ///< [g/m3] as measured, background still in it; the limit when censored
  double error = 0.0;     ///< [g/m3] standard deviation, > 0
  bool censored = false;  ///< under the detection limit: known only to be <= value
  int line = 0;           ///< in its CSV
  int n_averaged = 1;     ///< readings of the same time behind it
};

struct SamplingPoint {
  std::string at;  ///< "outlet" or a zone's name (user networks)
  std::string csv;
  std::vector<TracerSample> samples;  ///< time order, from the dose on
  std::vector<TracerSample> before;   ///< before the dose
  double detection_limit = 0.0;       ///< [g/m3], 0 when not stated
  double error_absolute = 0.0;        ///< [g/m3] part of the standard deviation of one reading
  double error_relative = 0.0;        ///< [1] part in proportion to the reading
  std::vector<std::string> notes;     ///< what was cleaned: duplicates averaged, rows dropped ...
};

struct PulseDose {
  double mass = 0.0;      ///< [g]
  double duration = 0.0;  ///< [d] >= 0
};
struct StepDose {
  double concentration = 0.0;  ///< [g/m3] added to the feed
};

/// Background concentration under the tracer: constant, or a straight line in time.
struct Background {
  double level = 0.0;  ///< [g/m3] at the dose
  double slope = 0.0;  ///< [g/m3/d]
  std::string how;     ///< "as stated", "mean of 4 samples before the dose", ...
};

/// A tracer test, validated and cleaned. Time zero: as in the files, or the dose where times are
/// dates; the dose starts at `dose_at`.
struct TracerTest {
  std::string title;
  std::string tracer;
  core::Volume volume;       ///< nominal
  core::FlowRate mean_flow;  ///< over the test (the constant one, or the time mean of the record)
  std::optional<core::Timeline> flow_record;  ///< [m3/d]
  double dose_at = 0.0;                       ///< [d]
  std::variant<PulseDose, StepDose> dose;
  std::string dose_into;  ///< "feed" or a zone's name (user networks)
  Background background;
  std::vector<SamplingPoint> points;
  bool recovery_fitted = true;
  bool robust = false;  ///< outlying samples count less ("loss": "robust")
  bool conservative = true;
  std::vector<std::string> models;       ///< candidate names wanted
  std::vector<std::string> model_cases;  ///< paths of user networks, relative to the test
  std::vector<std::string> notes;

  /// Turnovers since the dose: integral of Q/V from dose_at to t (negative before).
  [[nodiscard]] double turnovers(double t) const;
  /// Its inverse: the earliest time of that many turnovers. Infinite when the record ends with no
  /// flow before they are reached.
  [[nodiscard]] double time_at(double turnovers) const;
};

/// Reads and cleans a test document ("stillzone": "test/1") and its CSV files. Nothing is returned
/// when there was a fault.
[[nodiscard]] std::optional<TracerTest> read_tracer_test(const core::JsonDocument& document,
                                                         const core::UnitReader& units,
                                                         core::FaultList& faults);

}  // namespace stillzone::network
