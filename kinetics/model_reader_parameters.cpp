#include <fmt/format.h>

#include <array>
#include <cmath>
#include <utility>

#include "core/near_name.hpp"
#include "kinetics/model_reader.hpp"
#include "kinetics/model_unit.hpp"

namespace stillzone::kinetics {

namespace {

using Need = core::ObjectReader::Need;

const std::string kValueClause =
    "a parameter is a number with its unit (\"8 1/d\"), or a bare "
    "number when it has none";

/// A number with its unit, or a bare number.
std::optional<WrittenValue> written_value(const core::Json& node) {
  if (node.is_number()) return WrittenValue{node.get<double>(), "1"};
  if (node.is_string()) return split_value(node.get<std::string>());
  return std::nullopt;
}

}  // namespace

void ModelReader::read_parameters() {
  program_->parameters.resize(parameters_.size());
  for (std::size_t i = 0; i < parameters_.size(); ++i) read_parameter(i);
  apply_changes();
}

void ModelReader::read_parameter(std::size_t index) {
  const auto& [name, place] = parameters_[index];
  const core::Json& node = *place.first;
  const std::string& pointer = place.second;
  ModelParameter& parameter = program_->parameters[index];
  parameter.name = name;
  TemperatureLaw law;
  std::optional<WrittenValue> value;
  if (node.is_object()) {
    core::ObjectReader reader(context_, node, pointer);
    if (const core::Json* raw = reader.raw("value")) {
      value = written_value(*raw);
      if (!value) reader.fault("value", core::shown(*raw), kValueClause, "");
    } else {
      reader.fault("", "no \"value\"", kValueClause, "");
    }
    parameter.meaning = reader.text("meaning", Need::optional).value_or("");
    parameter.source = reader.text("source", Need::optional).value_or("");
    law = read_law(reader, parameter.law);
    reader.finish();
  } else {
    value = written_value(node);
    if (!value) fault(pointer, core::shown(node), kValueClause, "");
  }
  parameter.value = value ? value->value : 1.0;
  parameter.unit = value ? value->unit : "1";
  names_->set_parameter(index, parameter.value, std::move(law));
}

TemperatureLaw ModelReader::read_law(core::ObjectReader& parameter, std::string& words) {
  const core::Json* node = parameter.raw("temperature");
  if (node == nullptr) return {};
  core::ObjectReader law(context_, *node, parameter.pointer_to("temperature"));
  TemperatureLaw result = read_law_object(law, *node, words);
  law.finish();
  return result;
}

TemperatureLaw ModelReader::read_law_object(core::ObjectReader& law, const core::Json& node,
                                            std::string& words) {
  using Kind = TemperatureLaw::Kind;
  static constexpr std::array<std::pair<std::string_view, Kind>, 4> kForms{
      {{"enthalpy", Kind::enthalpy},
       {"pK_enthalpy", Kind::pk_enthalpy},
       {"theta", Kind::theta},
       {"expression", Kind::expression}}};
  TemperatureLaw result;
  result.pointer = law.pointer();
  if (!node.is_object()) return result;
  int n_forms = 0;
  for (const auto& [key, kind] : kForms) {
    if (law.raw(key) == nullptr) continue;
    ++n_forms;
    result.kind = kind;
    if (kind == Kind::expression) {
      result.expression = law.text(key, Need::required).value_or("value");
      result.pointer = law.pointer_to(key);
      words = result.expression;
    } else if (kind == Kind::theta) {
      result.amount = law.number(key, Need::required).value_or(1.0);
      if (result.amount <= 0.0) {
        law.fault(key, fmt::format("{}", result.amount), "theta must be > 0", "");
      }
    } else if (const auto text = law.text(key, Need::required)) {
      const auto written = split_value(*text);
      std::string problem = "an enthalpy is a number with its unit";
      std::optional<core::UnitReader::Scale> factor;
      if (written) factor = context_.units.scale_between(written->unit, "J/mol", problem);
      if (factor) {
        result.amount = written->value * factor->scale;
      } else {
        law.fault(key, fmt::format("\"{}\"", *text), problem, "Write it like \"55900 J/mol\".");
      }
    }
  }
  if (n_forms != 1) {
    law.fault(
        "", n_forms == 0 ? "a temperature law without a form" : "several temperature laws",
        "exactly one of \"enthalpy\", \"pK_enthalpy\", \"theta\" and \"expression\" is allowed",
        "");
  }
  if (result.kind == Kind::expression) return result;
  const auto at = law.quantity_value("at", core::Measure::temperature, Need::required,
                                     core::ObjectReader::positive(core::Measure::temperature));
  result.at = at.value_or(298.15);
  if (result.kind == Kind::theta) {
    words = fmt::format("value * {} ^ (T - {} K)", result.amount, result.at);
  } else {
    words =
        fmt::format("van 't Hoff{}, {} J/mol, value at {} K",
                    result.kind == Kind::pk_enthalpy ? " on the pK" : "", result.amount, result.at);
  }
  return result;
}

void ModelReader::read_terms() {
  for (std::size_t i = 0; i < terms_.size(); ++i) {
    const core::Json& node = *terms_[i].second.first;
    const std::string& pointer = terms_[i].second.second;
    std::string text = "1";
    if (node.is_string()) {
      text = node.get<std::string>();
    } else if (node.is_number()) {
      text = node.dump();
    } else {
      fault(pointer, core::shown(node), "a term is an expression in quotes", "");
    }
    program_->terms.push_back({terms_[i].first, text, NodeId()});
    names_->set_term(i, std::move(text), pointer);
  }
}

void ModelReader::apply_changes() {
  std::vector<std::string> known;
  for (const auto& parameter : parameters_) known.push_back(parameter.first);
  for (const ParameterChange& change : changes_) {
    const auto index = names_->find(change.name, ModelNames::Kind::parameter);
    if (index) {
      apply_change(change, *index);
      continue;
    }
    change_context_.faults.add(
        {.file = change_context_.document.name(),
         .pointer = change.pointer,
         .line = change_context_.document.line_of(change.pointer),
         .found = fmt::format("parameter \"{}\"", change.name),
         .allowed = fmt::format("the model \"{}\" has no parameter of this name", model_.name),
         .way_out = core::name_hint(change.name, known)});
  }
}

/// A value of "set" in the parameter's own unit. `is_spread_width` refuses what is not positive.
std::optional<double> ModelReader::changed_value(const core::Json& node, const std::string& pointer,
                                                 const ModelParameter& parameter,
                                                 bool is_spread_width) {
  const auto add_fault = [&](std::string found, std::string allowed, std::string way_out) {
    change_context_.faults.add({.file = change_context_.document.name(),
                                .pointer = pointer,
                                .line = change_context_.document.line_of(pointer),
                                .found = std::move(found),
                                .allowed = std::move(allowed),
                                .way_out = std::move(way_out)});
  };
  const std::string example =
      parameter.unit == "1"
          ? fmt::format("Write it like {}.", parameter.value)
          : fmt::format("Write it like \"{} {}\".", parameter.value, parameter.unit);
  const auto written = written_value(node);
  if (!written) {
    add_fault(core::shown(node),
              fmt::format("\"{}\" is a number in {}", parameter.name,
                          parameter.unit == "1" ? "no unit" : parameter.unit),
              example);
    return std::nullopt;
  }
  std::string problem;
  const auto factor = context_.units.scale_between(written->unit, parameter.unit, problem);
  if (!factor) {
    add_fault(core::shown(node), problem, example);
    return std::nullopt;
  }
  if (is_spread_width && written->value <= 0.0) {
    add_fault(core::shown(node), "a spread must be > 0", "");
    return std::nullopt;
  }
  return written->value * factor->scale + (is_spread_width ? 0.0 : factor->offset);
}

void ModelReader::apply_change(const ParameterChange& change, std::size_t index) {
  ModelParameter& parameter = program_->parameters[index];
  if (!change.node->is_object()) {
    const auto value = changed_value(*change.node, change.pointer, parameter, false);
    parameter.value = value.value_or(parameter.value);
    names_->change_parameter(index, parameter.value);
    return;
  }
  core::ObjectReader reader(change_context_, *change.node, change.pointer);
  const core::Json* node = reader.raw("value");
  if (node == nullptr) reader.fault("", "no \"value\"", "a free parameter has a value", "");
  const auto value = node == nullptr
                         ? std::nullopt
                         : changed_value(*node, reader.pointer_to("value"), parameter, false);
  core::FreeQuantity quantity;
  quantity.pointer = change.pointer;
  quantity.value = value.value_or(parameter.value);
  if (const core::Json* fit = reader.raw("fit")) {
    read_fit(*fit, reader.pointer_to("fit"), parameter, quantity);
  }
  if (const core::Json* spread = reader.raw("spread")) {
    read_spread(*spread, reader.pointer_to("spread"), parameter, quantity);
  }
  reader.finish();
  parameter.value = quantity.value;
  names_->change_parameter(index, parameter.value);
  if (quantity.fit_low || quantity.spread) change_context_.free_quantities.push_back(quantity);
}

void ModelReader::read_fit(const core::Json& node, const std::string& pointer,
                           const ModelParameter& parameter, core::FreeQuantity& quantity) {
  if (!node.is_array() || node.size() != 2) {
    change_context_.faults.add(
        {.file = change_context_.document.name(),
         .pointer = pointer,
         .line = change_context_.document.line_of(pointer),
         .found = core::shown(node),
         .allowed = "a list of two is allowed, the lowest and the highest value",
         .way_out = ""});
    return;
  }
  const auto low = changed_value(node[0], pointer + "/0", parameter, false);
  const auto high = changed_value(node[1], pointer + "/1", parameter, false);
  if (!low || !high) return;
  if (!(*low <= quantity.value && quantity.value <= *high && *low < *high)) {
    change_context_.faults.add(
        {.file = change_context_.document.name(),
         .pointer = pointer,
         .line = change_context_.document.line_of(pointer),
         .found = fmt::format("{} to {} with the value {}", *low, *high, quantity.value),
         .allowed = "the lowest value must be below the highest, and the value between them",
         .way_out = ""});
    return;
  }
  quantity.fit_low = low;
  quantity.fit_high = high;
}

void ModelReader::read_spread(const core::Json& node, const std::string& pointer,
                              const ModelParameter& parameter, core::FreeQuantity& quantity) {
  using Kind = core::Spread::Kind;
  core::ObjectReader reader(change_context_, node, pointer);
  if (!node.is_object()) return;
  int n_kinds = 0;
  core::Spread spread;
  if (const core::Json* raw = reader.raw("normal")) {
    ++n_kinds;
    spread.kind = Kind::normal;
    spread.a = changed_value(*raw, reader.pointer_to("normal"), parameter, true).value_or(1.0);
  }
  if (reader.has("lognormal")) {
    ++n_kinds;
    spread.kind = Kind::lognormal;
    spread.a = reader.number("lognormal", Need::required).value_or(1.0);
    if (spread.a <= 0.0) {
      reader.fault("lognormal", fmt::format("{}", spread.a), "a spread must be > 0", "");
    }
  }
  for (const auto& [key, kind] : {std::pair<std::string, Kind>{"uniform", Kind::uniform},
                                  std::pair<std::string, Kind>{"triangular", Kind::triangular}}) {
    const core::Json* raw = reader.raw(key);
    if (raw == nullptr) continue;
    ++n_kinds;
    spread.kind = kind;
    core::FreeQuantity range;
    range.value = quantity.value;
    read_fit(*raw, reader.pointer_to(key), parameter, range);
    spread.a = range.fit_low.value_or(0.0);
    spread.b = range.fit_high.value_or(1.0);
  }
  if (n_kinds != 1) {
    reader.fault("", n_kinds == 0 ? "a spread without a kind" : "several kinds of spread",
                 "exactly one of \"normal\", \"lognormal\", \"uniform\" and \"triangular\" is "
                 "allowed",
                 "");
  }
  reader.finish();
  quantity.spread = spread;
}

}  // namespace stillzone::kinetics
