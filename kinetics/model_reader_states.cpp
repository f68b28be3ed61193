#include <fmt/format.h>

#include <algorithm>
#include <array>
#include <utility>

#include "core/near_name.hpp"
#include "kinetics/model_reader.hpp"

namespace stillzone::kinetics {

namespace {

using Need = core::ObjectReader::Need;

const std::vector<std::string> kPhases{"dissolved", "particulate"};
const std::vector<std::string> kGasRoles{"methane", "carbon_dioxide", "hydrogen",
                                         "hydrogen_sulfide"};
constexpr double kDefaultFloor = 1e-6;

}  // namespace

bool ModelReader::check_inputs(NodeId node, const std::string& pointer, const std::string& text,
                               const std::function<bool(std::size_t input)>& allowed,
                               const std::string& clause) {
  for (const std::size_t input : program_->graph.inputs_of(node)) {
    if (allowed(input)) continue;
    const std::string name = names_->input_name(input);
    fault(pointer,
          name == text ? fmt::format("\"{}\"", text)
                       : fmt::format("\"{}\" depends on \"{}\"", text, name),
          clause, "");
    return false;
  }
  return true;
}

/// A number, or an expression of parameters that do not follow the temperature.
std::optional<double> ModelReader::constant_value(const core::Json& node,
                                                  const std::string& pointer,
                                                  const std::string& what) {
  const auto value = names_->number_or_expression(node, pointer);
  if (!value) return std::nullopt;
  const bool is_constant = check_inputs(
      *value, pointer, node.is_string() ? node.get<std::string>() : node.dump(),
      [](std::size_t) { return false; },
      what + " is a number or an expression of parameters that do not follow the temperature");
  if (!is_constant) return std::nullopt;
  return program_->graph.evaluate(*value, {});
}

Content ModelReader::read_content(core::ObjectReader& owner) {
  Content content;
  const core::Json* node = owner.raw("holds");
  if (node == nullptr) return content;
  core::ObjectReader holds(context_, *node, owner.pointer_to("holds"));
  const std::array<std::pair<std::string_view, double*>, 4> parts{{{"COD", &content.cod},
                                                                   {"C", &content.carbon},
                                                                   {"N", &content.nitrogen},
                                                                   {"charge", &content.charge}}};
  for (const auto& [key, target] : parts) {
    const core::Json* part = holds.raw(key);
    if (part == nullptr) continue;
    *target = constant_value(*part, holds.pointer_to(key), "a content").value_or(0.0);
  }
  holds.finish();
  return content;
}

double ModelReader::read_floor(core::ObjectReader& reader) {
  const double floor = reader.number("floor", Need::optional).value_or(kDefaultFloor);
  if (!(floor > 0.0)) {
    reader.fault("floor", fmt::format("{}", floor),
                 "a floor (the magnitude that does not matter any more) must be > 0", "");
  }
  return floor;
}

double ModelReader::read_seed(core::ObjectReader& reader) {
  return reader.number("seed", Need::optional).value_or(0.0);
}

void ModelReader::read_component(std::size_t index) {
  const auto& [name, place] = components_[index];
  core::ObjectReader reader(context_, *place.first, place.second);
  Component component;
  component.name = name;
  if (place.first->is_object()) {
    component.unit = reader.text("unit", Need::required).value_or("");
    component.meaning = reader.text("meaning", Need::optional).value_or("");
    const auto phase = reader.word("phase", kPhases, Need::required);
    component.phase = phase == "particulate" ? Phase::particulate : Phase::dissolved;
    component.content = read_content(reader);
    component.floor = read_floor(reader);
    component.seed = read_seed(reader);
  }
  reader.finish();
  model_.components.push_back(std::move(component));
}

void ModelReader::read_implicit(std::size_t index) {
  const auto& [name, place] = implicits_[index];
  core::ObjectReader reader(context_, *place.first, place.second);
  Implicit implicit;
  implicit.name = name;
  NodeId equation = program_->graph.constant(0.0);
  std::string text;
  if (place.first->is_object()) {
    implicit.unit = reader.text("unit", Need::required).value_or("");
    implicit.meaning = reader.text("meaning", Need::optional).value_or("");
    const auto low = reader.number("low", Need::required);
    const auto high = reader.number("high", Need::required);
    const auto start = reader.number("start", Need::required);
    implicit.low = low.value_or(0.0);
    implicit.high = high.value_or(0.0);
    implicit.start = start.value_or(0.0);
    if (low && high && !(*low < *high)) {
      reader.fault("low", fmt::format("{} with \"high\" {}", *low, *high),
                   "\"low\" must be below \"high\"", "The root is sought between the two.");
    } else if (low && high && start && !(*low <= *start && *start <= *high)) {
      reader.fault("start", fmt::format("{}", *start),
                   fmt::format("the first guess must lie between {} and {}", *low, *high), "");
    }
    if (const auto written = reader.text("equation", Need::required)) {
      text = *written;
      const std::string pointer = reader.pointer_to("equation");
      if (const auto node = names_->parse(text, pointer)) {
        equation = *node;
        const std::size_t own = program_->n_components + index;
        const std::size_t first_gas = program_->n_components + program_->n_implicits;
        const bool fits = check_inputs(
            equation, pointer, text,
            [&](std::size_t input) {
              return input < first_gas || input == program_->input_temperature();
            },
            "an implicit equation holds inside the liquid: components, implicit unknowns, "
            "parameters and T are allowed");
        const auto inputs = program_->graph.inputs_of(equation);
        if (fits && std::ranges::find(inputs, own) == inputs.end()) {
          fault(pointer, fmt::format("\"{}\" does not depend on \"{}\"", text, name),
                "the equation must hold the unknown it is to find", "");
        }
      }
    }
  }
  reader.finish();
  program_->implicit.push_back(equation);
  program_->implicit_text.push_back(text);
  model_.implicits.push_back(std::move(implicit));
}

/// Before anything uses a partial pressure.
void ModelReader::read_gas_amounts() {
  for (std::size_t g = 0; g < gases_.size(); ++g) {
    const core::Json& node = *gases_[g].second.first;
    const std::string pointer = gases_[g].second.second + "/kmol_per_unit";
    Gas gas;
    gas.name = gases_[g].first;
    if (node.is_object() && node.contains("kmol_per_unit")) {
      const auto amount = constant_value(node["kmol_per_unit"], pointer, "kmol_per_unit");
      if (amount && !(*amount > 0.0)) {
        fault(pointer, fmt::format("{}", *amount), "the kmol in one unit of a gas must be > 0", "");
      }
      gas.kmol_per_unit = amount.value_or(1.0);
      names_->set_gas_amount(g, gas.kmol_per_unit);
    } else if (node.is_object()) {
      fault(gases_[g].second.second, "no \"kmol_per_unit\"",
            "a gas says how many kmol one unit of it holds, for its partial pressure",
            "For a gas counted in kg COD of methane write \"1/64\".");
    }
    model_.gases.push_back(std::move(gas));
  }
}

void ModelReader::read_gas(std::size_t index) {
  const auto& [name, place] = gases_[index];
  core::ObjectReader reader(context_, *place.first, place.second);
  Gas& gas = model_.gases[index];
  NodeId transfer = program_->graph.constant(0.0);
  std::string text;
  std::size_t from = 0;
  if (place.first->is_object()) {
    static_cast<void>(reader.raw("kmol_per_unit"));
    static_cast<void>(reader.text("pressure", Need::optional));
    gas.unit = reader.text("unit", Need::required).value_or("");
    gas.meaning = reader.text("meaning", Need::optional).value_or("");
    gas.content = read_content(reader);
    gas.floor = read_floor(reader);
    gas.seed = read_seed(reader);
    gas.role = reader.word("role", kGasRoles, Need::optional).value_or("");
    if (const auto source = reader.text("from", Need::required)) {
      const auto component = names_->find(*source, ModelNames::Kind::component);
      from = component.value_or(0);
      if (!component) {
        reader.fault("from", fmt::format("\"{}\"", *source), "a gas comes from a component",
                     core::name_hint(*source, names_->names(ModelNames::Kind::component)));
      }
    }
    if (const auto written = reader.text("transfer", Need::required)) {
      text = *written;
      transfer = names_->parse(text, reader.pointer_to("transfer")).value_or(transfer);
    }
  }
  reader.finish();
  program_->transfer.push_back(transfer);
  program_->transfer_from.push_back(from);
  program_->transfer_text.push_back(text);
}

void ModelReader::read_vapour_pressure(core::ObjectReader& file) {
  program_->vapour_pressure = program_->graph.constant(0.0);
  const core::Json* node = file.raw("vapour_pressure");
  if (node == nullptr) {
    if (!gases_.empty()) {
      file.fault("", "no \"vapour_pressure\"",
                 "a model with gases gives the water vapour pressure in bar",
                 "Write an expression of T, the headspace temperature in K, or 0.");
    }
    return;
  }
  const std::string pointer = file.pointer_to("vapour_pressure");
  const auto pressure = names_->number_or_expression(*node, pointer, TemperatureOf::gas);
  if (!pressure) return;
  program_->vapour_pressure = *pressure;
  check_inputs(
      *pressure, pointer, node->is_string() ? node->get<std::string>() : node->dump(),
      [&](std::size_t input) { return input == program_->input_gas_temperature(); },
      "the water vapour pressure may depend on the temperature and parameters only");
}

void ModelReader::read_derived() {
  for (const auto& [name, place] : derived_) {
    const core::Json& node = *place.first;
    core::ObjectReader reader(context_, node, place.second);
    Derived derived;
    derived.name = name;
    NodeId value = program_->graph.constant(0.0);
    if (node.is_object()) {
      derived.unit = reader.text("unit", Need::required).value_or("");
      derived.meaning = reader.text("meaning", Need::optional).value_or("");
      const bool is_term = names_->find(name, ModelNames::Kind::term).has_value();
      if (names_->knows(name) && !is_term) {
        fault(place.second, fmt::format("name \"{}\"", name),
              "it already names something else in this model", "Choose another name.");
      }
      if (is_term && !reader.has("expression")) {
        value = *names_->node(name, TemperatureOf::liquid);
      } else if (const auto text = reader.text("expression", Need::required)) {
        value = names_->parse(*text, reader.pointer_to("expression")).value_or(value);
      }
      const std::size_t first_gas = program_->n_components + program_->n_implicits;
      check_inputs(
          value, place.second, name,
          [&](std::size_t input) {
            return input < first_gas || input == program_->input_temperature();
          },
          "a derived quantity follows from the liquid: components, implicit unknowns, parameters "
          "and T are allowed");
    }
    reader.finish();
    program_->derived.push_back(value);
    model_.derived.push_back(std::move(derived));
  }
}

void ModelReader::read_groups() {
  for (const auto& [name, place] : groups_) {
    const core::Json& node = *place.first;
    const auto component = node.is_string()
                               ? names_->find(node.get<std::string>(), ModelNames::Kind::component)
                               : std::nullopt;
    if (!component) {
      const auto known = names_->names(ModelNames::Kind::component);
      fault(place.second, core::shown(node), "a microbial group is the name of its component",
            node.is_string() ? core::name_hint(node.get<std::string>(), known) : "");
      continue;
    }
    model_.groups.push_back({name, *component});
  }
}

}  // namespace stillzone::kinetics
