#pragma once

#include <optional>
#include <string>
#include <utility>
#include <vector>

#include "core/csv_table.hpp"
#include "core/json_reader.hpp"

namespace stillzone::core {

/// A factor over time that is constant between known instants: a mixer on and off, a pulsed feed, a
/// record from a CSV. All times [d].
///
/// Periodic part: on (factor 1) in [first_on + k every, first_on + k every + on_for), else `idle`.
/// One-off windows: `on` windows force factor 1, `off` windows force `idle`; off wins.
class Timeline {
 public:
  struct Periodic {
    double every = 1.0;     ///< [d] > 0
    double on_for = 1.0;    ///< [d] 0 < on_for <= every
    double first_on = 0.0;  ///< [d]
  };
  struct Window {
    double from = 0.0;   ///< [d]
    double until = 0.0;  ///< [d] > from
  };

  /// Always on.
  Timeline() = default;
  static Timeline switched(std::optional<Periodic> periodic, std::vector<Window> on,
                           std::vector<Window> off, double idle);
  /// Each value holds from its time on until the next; before the first time the first value holds.
  /// Times strictly rising.
  static Timeline steps(std::vector<double> times, std::vector<double> values);

  /// Value in the half-open interval that starts at t: right-continuous, exact at switch times.
  [[nodiscard]] double value_from(double t) const;
  /// First switch time strictly after t (where the value may change), or none.
  [[nodiscard]] std::optional<double> next_switch(double t) const;
  /// Mean over one period for a purely periodic timeline, else over [from, until].
  [[nodiscard]] double mean(double from, double until) const;
  /// The period [d] when the timeline is periodic and has no one-off windows and no steps; 0 when
  /// constant; none otherwise.
  [[nodiscard]] std::optional<double> period() const;

 private:
  std::optional<Periodic> periodic_;
  std::vector<Window> on_;
  std::vector<Window> off_;
  double idle_ = 0.0;
  std::vector<double> times_;
  std::vector<double> values_;
};

/// Reads a schedule: {"every", "on_for", "first_on", "idle", "on": [["10 d","12 d"]], "off": [..]}.
std::optional<Timeline> read_schedule(ObjectReader& reader);

/// Reads a record {"csv": "flow.csv", "time": {"column", "unit"}, "value": {"column", "unit"}}:
/// rows sorted by time (a fault names two rows with the same time), values in internal units, each
/// holding until the next row. `unit` of the value is left out for plain numbers (measure none).
std::optional<Timeline> read_record(ObjectReader& reader, std::optional<Measure> measure);

}  // namespace stillzone::core
