#pragma once

#include <functional>
#include <optional>
#include <span>
#include <string>
#include <string_view>
#include <vector>

#include "core/json_document.hpp"
#include "core/quantity.hpp"
#include "core/units.hpp"

namespace stillzone::core {

/// How a quantity may vary about its value: for `--samples` ("spread") or in a fit ("fit").
struct Spread {
  enum class Kind { normal, lognormal, uniform, triangular };
  Kind kind = Kind::normal;
  /// normal: standard deviation; lognormal: standard deviation of ln; uniform: low, high;
  /// triangular: low, high (the mode is the value). Internal units.
  double a = 0.0;
  double b = 0.0;
};
struct FreeQuantity {
  std::string pointer;  ///< JSON pointer of the quantity in its file
  Measure measure = Measure::share;
  double value = 0.0;                  ///< internal unit
  std::optional<double> fit_low = {};  ///< bounds of a fit, internal unit
  std::optional<double> fit_high = {};
  std::optional<Spread> spread = {};
};

/// What all readers of one file share.
struct ReadingContext {
  const JsonDocument& document;
  const UnitReader& units;
  FaultList& faults;
  std::vector<FreeQuantity>& free_quantities;
  /// What a reader mended or assumed, in sentences for the user; null: nobody listens.
  std::vector<std::string>* notes = nullptr;
};

/// Walks one JSON object. Each getter ticks its key off; `finish()` turns every key that nobody
/// asked for into a fault with "did you mean". Getters add a fault and return nothing when the
/// value is missing (and required) or wrong, so that a whole file is checked in one pass.
class ObjectReader {
 public:
  /// Adds a fault when `node` is not an object (the reader then finds no keys and stays quiet).
  ObjectReader(const ReadingContext& context, const Json& node, std::string pointer);

  [[nodiscard]] bool has(std::string_view key) const;
  /// The raw node, ticked off; nullptr when absent.
  const Json* raw(std::string_view key);
  /// Pointer of a key below this object.
  [[nodiscard]] std::string pointer_to(std::string_view key) const;
  [[nodiscard]] const std::string& pointer() const { return pointer_; }
  [[nodiscard]] const ReadingContext& context() const { return context_; }
  /// Keys in file order, asked for or not.
  [[nodiscard]] std::vector<std::string> keys() const;

  enum class Need { required, optional };
  std::optional<std::string> text(std::string_view key, Need need);
  std::optional<bool> flag(std::string_view key, Need need);
  /// A bare number (the key has no unit).
  std::optional<double> number(std::string_view key, Need need);
  std::optional<long long> integer(std::string_view key, Need need);
  /// One of a few words; a fault lists them.
  std::optional<std::string> word(std::string_view key, std::span<const std::string> words,
                                  Need need);

  /// Limits on a quantity's value, in internal units, with the clause a fault shows.
  struct Limit {
    double low = -1e300;
    double high = 1e300;
    bool low_open = false;  ///< the low end itself is not allowed
    std::string clause;     ///< e.g. "a volume must be > 0"
  };
  static Limit positive(Measure measure);
  static Limit not_negative(Measure measure);

  /// A written quantity "170 m3/d", or {"value": .., "fit": [..], "spread": {..}} (then it is added
  /// to the context's free quantities). For Measure::share "5 %" and bare numbers are both fine.
  template <Measure M>
  std::optional<Quantity<M>> quantity(std::string_view key, Need need, const Limit& limit) {
    const auto internal = quantity_value(key, M, need, limit);
    if (!internal) return std::nullopt;
    return Quantity<M>(*internal);
  }
  std::optional<double> quantity_value(std::string_view key, Measure measure, Need need,
                                       const Limit& limit);

  /// Visits a sub-object / an array's elements. Faults when the kind of node is wrong.
  std::optional<ObjectReader> object(std::string_view key, Need need);
  void each_member(std::string_view key, Need need,
                   const std::function<void(const std::string& name, const Json& node,
                                            const std::string& pointer)>& visit);
  void each_element(std::string_view key, Need need,
                    const std::function<void(const Json& node, const std::string& pointer)>& visit);

  /// Adds a fault at a key (or at the object itself with key "").
  void fault(std::string_view key, std::string found, std::string allowed, std::string way_out);

  /// Unknown keys become faults. Call once, last.
  void finish();

 private:
  const ReadingContext& context_;
  const Json* node_;
  std::string pointer_;
  std::vector<std::string> known_;
};

/// A node as a quantity, for places that are not members of an object (array elements).
std::optional<double> read_quantity(const ReadingContext& context, const Json& node,
                                    const std::string& pointer, Measure measure,
                                    const ObjectReader::Limit& limit);

/// How a node is shown in a message: strings quoted, long ones cut, objects as "an object".
[[nodiscard]] std::string shown(const Json& node);

}  // namespace stillzone::core
