#include "kinetics/model_reader.hpp"

#include <fmt/format.h>

#include <algorithm>
#include <array>
#include <utility>

#include "kinetics/model_unit.hpp"

namespace stillzone::kinetics {

namespace {

using Need = core::ObjectReader::Need;

constexpr std::string_view kFormat = "model/1";
constexpr std::string_view kGasConstantUnit = "bar m3/kmol/K";
/// More would be a mistake of a generator, and costs memory squared.
constexpr std::size_t kMaxMembers = 2000;

}  // namespace

ModelReader::ModelReader(const core::ReadingContext& context, const core::Json& root,
                         const core::ReadingContext& change_context,
                         std::vector<ParameterChange> changes)
    : context_(context),
      root_(root),
      change_context_(change_context),
      changes_(std::move(changes)),
      program_(std::make_unique<ModelProgram>()) {}

void ModelReader::fault(const std::string& pointer, std::string found, std::string allowed,
                        std::string way_out) {
  context_.faults.add({.file = context_.document.name(),
                       .pointer = pointer,
                       .line = context_.document.line_of(pointer),
                       .found = std::move(found),
                       .allowed = std::move(allowed),
                       .way_out = std::move(way_out)});
}

ModelReader::Section ModelReader::section(core::ObjectReader& file, std::string_view key,
                                          Need need) {
  Section result;
  file.each_member(
      key, need, [&](const std::string& name, const core::Json& node, const std::string& pointer) {
        result.emplace_back(name, std::make_pair(&node, pointer));
      });
  if (result.size() > kMaxMembers) {
    fault(file.pointer_to(key), fmt::format("{} entries", result.size()),
          fmt::format("at most {} are allowed", kMaxMembers), "");
    result.clear();
  }
  return result;
}

void ModelReader::collect_sections(core::ObjectReader& file) {
  components_ = section(file, "components", Need::required);
  implicits_ = section(file, "implicit", Need::optional);
  gases_ = section(file, "gases", Need::optional);
  parameters_ = section(file, "parameters", Need::optional);
  terms_ = section(file, "terms", Need::optional);
  processes_ = section(file, "processes", Need::optional);
  derived_ = section(file, "derived", Need::optional);
  groups_ = section(file, "groups", Need::optional);
  if (components_.empty() && file.has("components")) {
    fault(file.pointer_to("components"), "no component", "a model describes at least one component",
          "");
  }
}

void ModelReader::declare_names() {
  using Kind = ModelNames::Kind;
  const auto declare = [&](const Section& section, Kind kind) {
    for (std::size_t i = 0; i < section.size(); ++i) {
      names_->declare(section[i].first, kind, i, section[i].second.second);
    }
  };
  declare(components_, Kind::component);
  declare(implicits_, Kind::implicit);
  declare(gases_, Kind::gas);
  for (std::size_t i = 0; i < gases_.size(); ++i) {
    const core::Json& node = *gases_[i].second.first;
    const std::string& pointer = gases_[i].second.second;
    if (node.is_object() && node.contains("pressure") && node["pressure"].is_string()) {
      names_->declare(node["pressure"].get<std::string>(), Kind::gas_pressure, i,
                      pointer + "/pressure");
    } else {
      names_->declare("p_" + gases_[i].first, Kind::gas_pressure, i, pointer);
    }
  }
  declare(parameters_, Kind::parameter);
  declare(terms_, Kind::term);
}

void ModelReader::read_header(core::ObjectReader& file) {
  if (const auto format = file.text("stillzone", Need::required); format && *format != kFormat) {
    file.fault("stillzone", fmt::format("\"{}\"", *format),
               fmt::format("a kinetic model says \"{}\"", kFormat), "");
  }
  model_.title = file.text("title", Need::required).value_or("");
  model_.source = file.text("source", Need::optional).value_or("");
  file.each_element("caveats", Need::optional,
                    [&](const core::Json& node, const std::string& pointer) {
                      if (node.is_string()) {
                        model_.caveats.push_back(node.get<std::string>());
                      } else {
                        fault(pointer, core::shown(node), "a caveat is a text", "");
                      }
                    });
}

void ModelReader::read_temperature_range(core::ObjectReader& file) {
  std::vector<double> ends;
  file.each_element(
      "temperature_range", Need::optional, [&](const core::Json& node, const std::string& pointer) {
        const auto end =
            core::read_quantity(context_, node, pointer, core::Measure::temperature, {});
        if (end) ends.push_back(*end);
      });
  if (!file.has("temperature_range")) return;
  if (ends.size() == 2 && ends[0] < ends[1]) {
    model_.temperature_range = {ends[0], ends[1]};
    return;
  }
  file.fault("temperature_range", core::shown(*file.raw("temperature_range")),
             "a range is a list of two temperatures, the lower first",
             "Write it like [\"30 degC\", \"40 degC\"].");
}

double ModelReader::read_gas_constant(core::ObjectReader& file) {
  const double usual = model_.gas_constant;
  const auto text = file.text("gas_constant", Need::optional);
  if (!text) return usual;
  const auto written = split_value(*text);
  if (!written || written->value <= 0.0) {
    file.fault("gas_constant", fmt::format("\"{}\"", *text),
               "a positive number with its unit is allowed",
               fmt::format("Write \"0.083145 {}\".", kGasConstantUnit));
    return usual;
  }
  std::string problem;
  const auto factor = context_.units.scale_between(written->unit, kGasConstantUnit, problem);
  if (!factor) {
    file.fault("gas_constant", fmt::format("\"{}\"", *text), problem,
               fmt::format("Write \"0.083145 {}\".", kGasConstantUnit));
    return usual;
  }
  return written->value * factor->scale;
}

/// source = sum of coefficient x rate over the processes, gas transfer taken off.
void ModelReader::assemble_sources() {
  ExpressionGraph& graph = program_->graph;
  program_->source.assign(program_->n_components, graph.constant(0.0));
  for (const Process& process : program_->processes) {
    for (const auto& [component, coefficient] : process.stoichiometry) {
      NodeId& sum = program_->source[component];
      sum = graph.add(sum, graph.multiply(coefficient, process.rate));
    }
  }
  for (std::size_t g = 0; g < program_->n_gases; ++g) {
    NodeId& sum = program_->source[program_->transfer_from[g]];
    sum = graph.subtract(sum, program_->transfer[g]);
  }
}

std::optional<KineticModel> ModelReader::read(std::string name) {
  const std::size_t n_faults_before = context_.faults.all().size();
  core::ObjectReader file(context_, root_, "");
  read_header(file);
  read_temperature_range(file);
  model_.name = std::move(name);
  model_.gas_constant = read_gas_constant(file);
  collect_sections(file);
  program_->n_components = components_.size();
  program_->n_implicits = implicits_.size();
  program_->n_gases = gases_.size();
  names_.emplace(context_, *program_, model_.gas_constant);
  declare_names();
  read_parameters();
  read_terms();
  read_gas_amounts();
  for (std::size_t i = 0; i < components_.size(); ++i) read_component(i);
  for (std::size_t i = 0; i < implicits_.size(); ++i) read_implicit(i);
  for (std::size_t i = 0; i < gases_.size(); ++i) read_gas(i);
  read_vapour_pressure(file);
  read_processes();
  read_derived();
  read_groups();
  if (const auto vfa = file.text("vfa", Need::optional)) {
    const bool known = std::ranges::any_of(
        model_.derived, [&](const Derived& derived) { return derived.name == *vfa; });
    if (!known) {
      file.fault("vfa", fmt::format("\"{}\"", *vfa), "the VFA is one of the derived quantities",
                 "Add it under \"derived\".");
    }
    model_.vfa = *vfa;
  }
  file.finish();
  if (context_.faults.all().size() != n_faults_before) return std::nullopt;
  for (ModelTerm& term : program_->terms) {
    term.node = *names_->node(term.name, TemperatureOf::liquid);
  }
  for (ModelParameter& parameter : program_->parameters) {
    parameter.node = *names_->node(parameter.name, TemperatureOf::liquid);
  }
  // Terms and laws that nothing uses were worked out only now.
  if (context_.faults.all().size() != n_faults_before) return std::nullopt;
  assemble_sources();
  model_.program = std::move(program_);
  return std::move(model_);
}

}  // namespace stillzone::kinetics
