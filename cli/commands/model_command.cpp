#include "cli/commands/model_command.hpp"

#include <fmt/format.h>

#include <filesystem>
#include <optional>

#include "cli/text_table.hpp"
#include "core/json_document.hpp"
#include "core/near_name.hpp"
#include "core/units.hpp"
#include "kinetics/model_audit.hpp"
#include "kinetics/model_matrix.hpp"

namespace stillzone::cli {
namespace {

using kinetics::Balance;
using kinetics::KineticModel;

/// A shipped model by name, else a file.
std::optional<KineticModel> load(const std::string& name, core::FaultList& faults) {
  const core::UnitReader units;
  const std::string_view text = kinetics::shipped_model_text(name);
  if (!text.empty()) {
    const auto document = core::JsonDocument::parse(text, name, ".", faults);
    return document ? kinetics::read_model(*document, units, faults) : std::nullopt;
  }
  if (!std::filesystem::exists(name) && name.find_first_of("./") == std::string::npos) {
    const auto shipped = kinetics::shipped_models();
    faults.add({.file = name,
                .found = "no shipped model and no file of this name",
                .allowed = "a model is shipped with the program or a file",
                .way_out = core::name_hint(name, shipped)});
    return std::nullopt;
  }
  const auto document = core::JsonDocument::read(name, faults);
  return document ? kinetics::read_model(*document, units, faults) : std::nullopt;
}

std::string component_table(const KineticModel& model) {
  TextTable table;
  table.column("component", TextTable::Align::left);
  table.column("unit", TextTable::Align::left);
  table.column("COD");
  table.column("C");
  table.column("N");
  table.column("charge");
  table.column("meaning", TextTable::Align::left);
  for (const auto& component : model.components) {
    table.row({component.name, component.unit, short_number(component.content.cod),
               short_number(component.content.carbon), short_number(component.content.nitrogen),
               short_number(component.content.charge), component.meaning});
  }
  return table.text();
}

std::string process_text(const KineticModel& model, const kinetics::ModelMatrix& matrix) {
  std::string text;
  int number = 0;
  for (const auto& row : matrix.rows) {
    text +=
        fmt::format("  {:>2}  {}\n      rate: {}\n", ++number,
                    row.meaning.empty() ? row.process : row.process + ": " + row.meaning, row.rate);
    for (const auto& entry : row.entries) {
      text += fmt::format("      {:>12}  {:<8} {}\n", fmt::format("{:+.6g}", entry.value),
                          model.components[entry.component].name, entry.written);
    }
  }
  return text;
}

std::string expressions(const std::vector<kinetics::NamedExpression>& list) {
  std::string text;
  for (const auto& [name, expression] : list)
    text += fmt::format("  {:<12} {}\n", name, expression);
  return text;
}

std::string parameter_table(const kinetics::ModelMatrix& matrix) {
  TextTable table;
  table.column("parameter", TextTable::Align::left);
  table.column("value");
  table.column("at 35 degC");
  table.column("unit", TextTable::Align::left);
  table.column("temperature", TextTable::Align::left);
  table.column("meaning", TextTable::Align::left);
  for (const auto& parameter : matrix.parameters) {
    table.row({parameter.name, fmt::format("{:.6g}", parameter.reference),
               fmt::format("{:.6g}", parameter.at_temperature), parameter.unit,
               parameter.law.empty() ? "-" : parameter.law, parameter.meaning});
  }
  return table.text();
}

std::string audit_table(const kinetics::ModelAudit& audit) {
  TextTable table;
  table.column("process", TextTable::Align::left);
  for (const char* name : {"COD", "C", "N", "charge"}) table.column(name);
  for (const auto& process : audit.processes) {
    std::vector<std::string> cells = {process.name};
    for (const auto& closure : process.closures) {
      if (!(closure.turnover > 0.0)) {
        cells.emplace_back("-");
      } else if (closure.relative() <= kinetics::ModelAudit::kClosed) {
        cells.emplace_back("closed");
      } else {
        cells.push_back(fmt::format("{:+.3e}", closure.error));
      }
    }
    table.row(cells);
  }
  return table.text();
}

int show(const CommandLine& line, Console& console) {
  core::FaultList faults;
  const auto model = load(line.input, faults);
  if (!model || !faults.empty()) {
    console.err << faults.text();
    return kWrongInput;
  }
  const auto matrix = kinetics::model_matrix(*model);
  const auto audit = kinetics::audit_model(*model);
  console.out << model->name << ": " << model->title << "\n"
              << model->source << "\n"
              << "\nComponents (contents per unit: kg COD, kmol C, kmol N, kmol charge)\n"
              << component_table(*model) << "\nProcesses (coefficients at 35 degC)\n"
              << process_text(*model, matrix);
  if (!matrix.terms.empty()) console.out << "\nTerms\n" << expressions(matrix.terms);
  if (!matrix.equations.empty()) {
    console.out << "\nEquations of the implicit unknowns (= 0)\n" << expressions(matrix.equations);
  }
  if (!matrix.transfers.empty()) {
    console.out << "\nGas transfer [gas unit per m3 of liquid and d]\n"
                << expressions(matrix.transfers);
  }
  console.out << "\nParameters\n"
              << parameter_table(matrix)
              << "\nAudit: what one unit of each process makes out of nothing (closed: within "
                 "1e-12 of its turnover; -: not touched)\n"
              << audit_table(audit);
  if (!model->caveats.empty()) console.out << "\nTo know\n";
  for (const std::string& caveat : model->caveats) console.out << "  - " << caveat << "\n";
  return kDone;
}

}  // namespace

Command model_command() {
  return {.name = "model",
          .summary = "prints a kinetic model as a matrix and audits its balances",
          .input_name = "MODEL",
          .input_meaning = "name of a shipped model (adm1, two_step, first_order, inert) or a file",
          .input_needed = true,
          .example = "stillzone model adm1",
          .writes_output = false,
          .reads_case = false,
          .run = show};
}

}  // namespace stillzone::cli
