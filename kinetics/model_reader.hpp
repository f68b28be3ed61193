#pragma once

#include <functional>
#include <optional>
#include <string>
#include <string_view>
#include <vector>

#include "core/json_reader.hpp"
#include "kinetics/kinetic_model.hpp"
#include "kinetics/model_names.hpp"
#include "kinetics/model_program.hpp"

namespace stillzone::kinetics {

/// A parameter given anew from outside the model's file ("set" in a case).
struct ParameterChange {
  std::string name;
  const core::Json* node = nullptr;  ///< "7 1/d" or {"value", "fit", "spread"}
  std::string pointer;
};

/// Turns one model document into a KineticModel: all names first, then parameters and terms, then
/// what uses them. Collects every fault of the file. (Format: kinetics/models/README.md.)
class ModelReader {
 public:
  /// @param root the document's root, with "extends" already worked in
  /// @param change_context of the file the changes stand in (the case)
  ModelReader(const core::ReadingContext& context, const core::Json& root,
              const core::ReadingContext& change_context, std::vector<ParameterChange> changes);

  /// Nothing when there was a fault.
  [[nodiscard]] std::optional<KineticModel> read(std::string name);

 private:
  using Section = std::vector<std::pair<std::string, std::pair<const core::Json*, std::string>>>;

  // model_reader.cpp
  void collect_sections(core::ObjectReader& file);
  Section section(core::ObjectReader& file, std::string_view key, core::ObjectReader::Need need);
  void declare_names();
  void read_header(core::ObjectReader& file);
  void read_temperature_range(core::ObjectReader& file);
  double read_gas_constant(core::ObjectReader& file);
  void assemble_sources();
  void fault(const std::string& pointer, std::string found, std::string allowed,
             std::string way_out);

  // model_reader_parameters.cpp
  void read_parameters();
  void read_parameter(std::size_t index);
  TemperatureLaw read_law(core::ObjectReader& parameter, std::string& words);
  TemperatureLaw read_law_object(core::ObjectReader& law, const core::Json& node,
                                 std::string& words);
  void read_terms();
  void apply_changes();
  void apply_change(const ParameterChange& change, std::size_t index);
  std::optional<double> changed_value(const core::Json& node, const std::string& pointer,
                                      const ModelParameter& parameter, bool is_spread_width);
  void read_fit(const core::Json& node, const std::string& pointer, const ModelParameter& parameter,
                core::FreeQuantity& quantity);
  void read_spread(const core::Json& node, const std::string& pointer,
                   const ModelParameter& parameter, core::FreeQuantity& quantity);

  // model_reader_states.cpp
  void read_component(std::size_t index);
  void read_implicit(std::size_t index);
  void read_gas(std::size_t index);
  void read_gas_amounts();
  void read_vapour_pressure(core::ObjectReader& file);
  void read_derived();
  void read_groups();
  Content read_content(core::ObjectReader& owner);
  double read_floor(core::ObjectReader& reader);
  double read_seed(core::ObjectReader& reader);
  std::optional<double> constant_value(const core::Json& node, const std::string& pointer,
                                       const std::string& what);
  /// Faults when an expression depends on inputs that `allowed` refuses.
  bool check_inputs(NodeId node, const std::string& pointer, const std::string& text,
                    const std::function<bool(std::size_t input)>& allowed,
                    const std::string& clause);

  // model_reader_processes.cpp
  void read_processes();
  void read_process(const std::string& name, const core::Json& node, const std::string& pointer);
  void read_stoichiometry(core::ObjectReader& reader, Process& process);

  const core::ReadingContext& context_;
  const core::Json& root_;
  const core::ReadingContext& change_context_;
  std::vector<ParameterChange> changes_;
  KineticModel model_;
  std::unique_ptr<ModelProgram> program_;
  std::optional<ModelNames> names_;
  Section components_, implicits_, gases_, parameters_, terms_, processes_, derived_, groups_;
};

}  // namespace stillzone::kinetics
