#pragma once

#include <memory>
#include <optional>
#include <string>
#include <string_view>

#include "core/quantity.hpp"

namespace stillzone::core {

/// Name of a measure for messages ("a flow"), its internal unit ("m3/d"), and examples of units a
/// user may write ("m3/d, L/s, MGD, gpm").
[[nodiscard]] std::string_view measure_name(Measure measure);
[[nodiscard]] std::string_view internal_unit(Measure measure);
[[nodiscard]] std::string_view example_units(Measure measure);

/// What became of a written quantity: the value in the internal unit, or why not.
struct UnitReading {
  std::optional<double> value;  ///< internal unit; empty when the text cannot be read
  std::string problem;          ///< e.g. "unit \"furlong/d\" is not known"; empty when fine
  std::string way_out;          ///< e.g. "Write a flow as m3/d, L/s, MGD or gpm."
};

/// Converts written quantities ("170 m3/d", "0.6 MG", "95 degF", "12 min") to internal units with
/// UDUNITS-2, the words of the trade added (US customary units included).
/// Not thread-safe (ut_parse is not): use while loading only. Owns its unit system.
class UnitReader {
 public:
  /// Throws std::runtime_error naming the places looked at when the UDUNITS database is missing.
  UnitReader();
  ~UnitReader();
  UnitReader(const UnitReader&) = delete;
  UnitReader& operator=(const UnitReader&) = delete;
  UnitReader(UnitReader&&) = delete;
  UnitReader& operator=(UnitReader&&) = delete;

  /// "170 m3/d" -> 170. The number and the unit are split first, so "35 degC" is 308.15 K.
  [[nodiscard]] UnitReading read(std::string_view text, Measure measure) const;

  /// A linear map from a written unit to the internal one: internal = scale * x + offset.
  /// For table columns. Empty when the unit does not fit the measure.
  struct Scale {
    double scale = 1.0;
    double offset = 0.0;
  };
  [[nodiscard]] std::optional<Scale> scale_of(std::string_view unit, Measure measure,
                                              std::string& problem) const;

  /// The same between two written units, for model parameters: "1/h" to "1/d", "g COD/L" to
  /// "kg COD/m3". What a unit counts (COD, C, N, VSS, CaCO3 ...) must agree where both state it.
  [[nodiscard]] std::optional<Scale> scale_between(std::string_view from, std::string_view to,
                                                   std::string& problem) const;

 private:
  struct Impl;
  std::unique_ptr<Impl> impl_;
};

}  // namespace stillzone::core
