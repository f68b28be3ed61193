#include "core/json_reader.hpp"

#include <fmt/format.h>

#include <algorithm>
#include <cmath>
#include <limits>
#include <utility>

#include "core/json_lines.hpp"
#include "core/near_name.hpp"

namespace stillzone::core {
namespace {

bool inside(double value, const ObjectReader::Limit& limit) {
  const bool above = limit.low_open ? value > limit.low : value >= limit.low;
  return above && value <= limit.high;
}

void add_fault(const ReadingContext& context, const std::string& pointer, std::string found,
               std::string allowed, std::string way_out) {
  context.faults.add({.file = context.document.name(),
                      .pointer = pointer,
                      .line = context.document.line_of(pointer),
                      .found = std::move(found),
                      .allowed = std::move(allowed),
                      .way_out = std::move(way_out)});
}

std::string kind_of(const Json& node) {
  if (node.is_object()) return "an object";
  if (node.is_array()) return "a list";
  return shown(node);
}

/// A written quantity or, for shares, a bare number; a fault otherwise.
std::optional<double> plain_quantity(const ReadingContext& context, const Json& node,
                                     const std::string& pointer, Measure measure) {
  if (node.is_number() && measure == Measure::share) return node.get<double>();
  if (node.is_string()) {
    const UnitReading reading = context.units.read(node.get<std::string>(), measure);
    if (reading.value) return reading.value;
    add_fault(context, pointer, shown(node), reading.problem, reading.way_out);
    return std::nullopt;
  }
  if (node.is_number()) {
    add_fault(context, pointer, shown(node),
              fmt::format("{} needs its unit", measure_name(measure)),
              fmt::format("Write \"{} {}\" (or {}).", shown(node), internal_unit(measure),
                          example_units(measure)));
    return std::nullopt;
  }
  add_fault(context, pointer, kind_of(node),
            fmt::format("{} is a text with number and unit", measure_name(measure)),
            fmt::format("Write it like \"1 {}\".", internal_unit(measure)));
  return std::nullopt;
}

/// A plain quantity within limits.
std::optional<double> fixed_quantity(const ReadingContext& context, const Json& node,
                                     const std::string& pointer, Measure measure,
                                     const ObjectReader::Limit& limit) {
  const auto value = plain_quantity(context, node, pointer, measure);
  if (!value) return std::nullopt;
  if (!inside(*value, limit)) {
    add_fault(context, pointer, shown(node), limit.clause, "");
    return std::nullopt;
  }
  return value;
}

/// The measure of a difference: a spread of 2 degC is 2 K.
Measure difference_measure(Measure measure) {
  return measure == Measure::temperature ? Measure::temperature_change : measure;
}

std::optional<std::pair<double, double>> read_pair(const ReadingContext& context, const Json& node,
                                                   const std::string& pointer, Measure measure) {
  if (!node.is_array() || node.size() != 2) {
    add_fault(context, pointer, kind_of(node), "a range is a list of two quantities",
              "Write it like [\"100 m3\", \"1500 m3\"].");
    return std::nullopt;
  }
  const auto low = plain_quantity(context, node[0], pointer + "/0", measure);
  const auto high = plain_quantity(context, node[1], pointer + "/1", measure);
  if (!low || !high) return std::nullopt;
  if (!(*low < *high)) {
    add_fault(context, pointer, fmt::format("[{}, {}]", shown(node[0]), shown(node[1])),
              "the low end comes first and is smaller", "Swap the two.");
    return std::nullopt;
  }
  return std::pair(*low, *high);
}

void read_spread(const ReadingContext& context, const Json& node, const std::string& pointer,
                 FreeQuantity& quantity) {
  ObjectReader reader(context, node, pointer);
  const std::size_t n = reader.keys().size();
  if (node.is_object() && n != 1) {
    add_fault(context, pointer, fmt::format("{} kinds of spread", n), "a spread has one kind",
              "Write {\"normal\": ..}, {\"lognormal\": ..}, {\"uniform\": [..]} or "
              "{\"triangular\": [..]}.");
  }
  for (const char* kind : {"normal", "lognormal", "uniform", "triangular"}) (void)reader.raw(kind);
  Spread spread;
  if (reader.has("normal")) {
    const Measure measure = difference_measure(quantity.measure);
    const auto deviation =
        fixed_quantity(context, *reader.raw("normal"), reader.pointer_to("normal"), measure,
                       ObjectReader::positive(measure));
    if (!deviation) return;
    spread = {Spread::Kind::normal, *deviation, 0.0};
  } else if (reader.has("lognormal")) {
    const auto deviation =
        fixed_quantity(context, *reader.raw("lognormal"), reader.pointer_to("lognormal"),
                       Measure::share, ObjectReader::positive(Measure::share));
    if (!deviation) return;
    spread = {Spread::Kind::lognormal, *deviation, 0.0};
    if (!(quantity.value > 0.0)) {
      reader.fault("lognormal", fmt::format("a value of {:g}", quantity.value),
                   "a lognormal spread needs a value > 0", "Use \"normal\".");
    }
  } else if (reader.has("uniform") || reader.has("triangular")) {
    const bool uniform = reader.has("uniform");
    const char* key = uniform ? "uniform" : "triangular";
    const auto range =
        read_pair(context, *reader.raw(key), reader.pointer_to(key), quantity.measure);
    if (!range) return;
    spread = {uniform ? Spread::Kind::uniform : Spread::Kind::triangular, range->first,
              range->second};
    if (!uniform && (quantity.value < range->first || quantity.value > range->second)) {
      reader.fault(key, "a value outside the range", "a triangle peaks at the value",
                   "Widen the range or move the value.");
    }
  }
  reader.finish();
  quantity.spread = spread;
}

/// {"value": .., "fit": [..], "spread": {..}}
std::optional<double> free_quantity(const ReadingContext& context, const Json& node,
                                    const std::string& pointer, Measure measure,
                                    const ObjectReader::Limit& limit) {
  ObjectReader reader(context, node, pointer);
  FreeQuantity quantity{.pointer = pointer, .measure = measure};
  const Json* written = reader.raw("value");
  if (written == nullptr) {
    reader.fault("", "no \"value\"", "a free quantity has a value",
                 "Write {\"value\": .., \"fit\": [.., ..]}.");
  }
  const auto value = written != nullptr
                         ? fixed_quantity(context, *written, pointer + "/value", measure, limit)
                         : std::nullopt;
  if (value) quantity.value = *value;
  if (const Json* fit = reader.raw("fit")) {
    const auto range = read_pair(context, *fit, pointer + "/fit", measure);
    if (range) {
      quantity.fit_low = range->first;
      quantity.fit_high = range->second;
      if (value && (*value < range->first || *value > range->second)) {
        reader.fault("fit", fmt::format("the value {:g} {}", *value, internal_unit(measure)),
                     fmt::format("a fit starts inside its bounds, here {:g} to {:g} {}",
                                 range->first, range->second, internal_unit(measure)),
                     "Widen the bounds or move the value.");
      }
      for (const double end : {range->first, range->second}) {
        if (!inside(end, limit)) {
          reader.fault("fit", fmt::format("an end of {:g} {}", end, internal_unit(measure)),
                       limit.clause, "Move the end.");
        }
      }
    }
  }
  if (const Json* spread = reader.raw("spread"); spread != nullptr && value) {
    read_spread(context, *spread, pointer + "/spread", quantity);
  }
  reader.finish();
  if (!value) return std::nullopt;
  context.free_quantities.push_back(quantity);
  return value;
}

}  // namespace

std::string shown(const Json& node) {
  if (node.is_object()) return "an object";
  if (node.is_array()) return "a list";
  std::string text = node.dump(-1, ' ', false, Json::error_handler_t::replace);
  constexpr std::size_t kLongest = 60;
  if (text.size() > kLongest) text = text.substr(0, kLongest) + "...";
  return text;
}

std::optional<double> read_quantity(const ReadingContext& context, const Json& node,
                                    const std::string& pointer, Measure measure,
                                    const ObjectReader::Limit& limit) {
  if (node.is_object()) return free_quantity(context, node, pointer, measure, limit);
  return fixed_quantity(context, node, pointer, measure, limit);
}

ObjectReader::ObjectReader(const ReadingContext& context, const Json& node, std::string pointer)
    : context_(context), node_(&node), pointer_(std::move(pointer)) {
  if (!node.is_object()) {
    add_fault(context_, pointer_, kind_of(node), "an object {..} belongs here",
              "Write its keys between { and }.");
    node_ = nullptr;
  }
}

bool ObjectReader::has(std::string_view key) const {
  return node_ != nullptr && node_->contains(key);
}

const Json* ObjectReader::raw(std::string_view key) {
  if (std::find(known_.begin(), known_.end(), key) == known_.end()) known_.emplace_back(key);
  if (node_ == nullptr) return nullptr;
  const auto found = node_->find(key);
  return found == node_->end() ? nullptr : &*found;
}

std::string ObjectReader::pointer_to(std::string_view key) const {
  return key.empty() ? pointer_ : pointer_ + "/" + pointer_escaped(key);
}

std::vector<std::string> ObjectReader::keys() const {
  std::vector<std::string> keys;
  if (node_ == nullptr) return keys;
  for (const auto& [key, value] : node_->items()) keys.push_back(key);
  return keys;
}

void ObjectReader::fault(std::string_view key, std::string found, std::string allowed,
                         std::string way_out) {
  add_fault(context_, pointer_to(key), std::move(found), std::move(allowed), std::move(way_out));
}

namespace {

/// The node of a key, or a fault when it is required and absent.
const Json* wanted(ObjectReader& reader, std::string_view key, ObjectReader::Need need,
                   const char* what) {
  const Json* node = reader.raw(key);
  if (node == nullptr && need == ObjectReader::Need::required) {
    reader.fault("", fmt::format("no \"{}\"", key), fmt::format("\"{}\" is needed: {}", key, what),
                 fmt::format("Add \"{}\".", key));
  }
  return node;
}

}  // namespace

std::optional<std::string> ObjectReader::text(std::string_view key, Need need) {
  const Json* node = wanted(*this, key, need, "a text");
  if (node == nullptr) return std::nullopt;
  if (!node->is_string()) {
    fault(key, kind_of(*node), "a text belongs here", "Put it in quotes.");
    return std::nullopt;
  }
  return node->get<std::string>();
}

std::optional<bool> ObjectReader::flag(std::string_view key, Need need) {
  const Json* node = wanted(*this, key, need, "true or false");
  if (node == nullptr) return std::nullopt;
  if (!node->is_boolean()) {
    fault(key, kind_of(*node), "true or false belongs here", "Write it without quotes.");
    return std::nullopt;
  }
  return node->get<bool>();
}

std::optional<double> ObjectReader::number(std::string_view key, Need need) {
  const Json* node = wanted(*this, key, need, "a number");
  if (node == nullptr) return std::nullopt;
  if (!node->is_number()) {
    fault(key, kind_of(*node), "a bare number belongs here", "Write it without quotes and unit.");
    return std::nullopt;
  }
  return node->get<double>();
}

std::optional<long long> ObjectReader::integer(std::string_view key, Need need) {
  const Json* node = wanted(*this, key, need, "a whole number");
  if (node == nullptr) return std::nullopt;
  const bool too_large = node->is_number_unsigned() &&
                         node->get<unsigned long long>() >
                             static_cast<unsigned long long>(std::numeric_limits<long long>::max());
  if (!node->is_number_integer() || too_large) {
    fault(key, kind_of(*node), "a whole number belongs here", "Write it without quotes and point.");
    return std::nullopt;
  }
  return node->get<long long>();
}

std::optional<std::string> ObjectReader::word(std::string_view key,
                                              std::span<const std::string> words, Need need) {
  const auto written = text(key, need);
  if (!written) return std::nullopt;
  if (std::find(words.begin(), words.end(), *written) != words.end()) return written;
  std::string allowed;
  for (std::size_t i = 0; i < words.size(); ++i) {
    allowed += (i == 0 ? "" : i + 1 == words.size() ? " or " : ", ") + ("\"" + words[i] + "\"");
  }
  const auto near = nearest_name(*written, words);
  fault(key, "\"" + *written + "\"", allowed + " belongs here",
        near ? "Did you mean \"" + *near + "\"?" : "");
  return std::nullopt;
}

ObjectReader::Limit ObjectReader::positive(Measure measure) {
  return {.low = 0.0,
          .low_open = true,
          .clause = fmt::format("{} must be > 0 here", measure_name(measure))};
}

ObjectReader::Limit ObjectReader::not_negative(Measure measure) {
  return {.low = 0.0, .clause = fmt::format("{} must be >= 0 here", measure_name(measure))};
}

std::optional<double> ObjectReader::quantity_value(std::string_view key, Measure measure, Need need,
                                                   const Limit& limit) {
  const std::string what =
      fmt::format("{}, like \"1 {}\"", measure_name(measure), internal_unit(measure));
  const Json* node = wanted(*this, key, need, what.c_str());
  if (node == nullptr) return std::nullopt;
  return read_quantity(context_, *node, pointer_to(key), measure, limit);
}

std::optional<ObjectReader> ObjectReader::object(std::string_view key, Need need) {
  const Json* node = wanted(*this, key, need, "an object");
  if (node == nullptr) return std::nullopt;
  if (!node->is_object()) {
    fault(key, kind_of(*node), "an object {..} belongs here", "Write its keys between { and }.");
    return std::nullopt;
  }
  return ObjectReader(context_, *node, pointer_to(key));
}

void ObjectReader::each_member(
    std::string_view key, Need need,
    const std::function<void(const std::string&, const Json&, const std::string&)>& visit) {
  const Json* node = wanted(*this, key, need, "an object of named entries");
  if (node == nullptr) return;
  if (!node->is_object()) {
    fault(key, kind_of(*node), "an object of named entries {\"name\": ..} belongs here",
          "Write its entries between { and }.");
    return;
  }
  const std::string pointer = pointer_to(key);
  for (const auto& [name, member] : node->items()) {
    visit(name, member, pointer + "/" + pointer_escaped(name));
  }
}

void ObjectReader::each_element(std::string_view key, Need need,
                                const std::function<void(const Json&, const std::string&)>& visit) {
  const Json* node = wanted(*this, key, need, "a list");
  if (node == nullptr) return;
  if (!node->is_array()) {
    fault(key, kind_of(*node), "a list [..] belongs here", "Write its entries between [ and ].");
    return;
  }
  const std::string pointer = pointer_to(key);
  std::size_t i = 0;
  for (const Json& element : *node) visit(element, fmt::format("{}/{}", pointer, i++));
}

void ObjectReader::finish() {
  for (const std::string& key : keys()) {
    if (std::find(known_.begin(), known_.end(), key) != known_.end()) continue;
    fault(key, fmt::format("key \"{}\"", key), "this key is not known here",
          name_hint(key, known_));
  }
}

}  // namespace stillzone::core
