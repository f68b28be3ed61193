#include "kinetics/kinetic_model.hpp"

#include <fmt/format.h>

#include <algorithm>
#include <fstream>
#include <system_error>
#include <utility>

#include "core/near_name.hpp"
#include "core/require.hpp"
#include "kinetics/model_program.hpp"
#include "kinetics/model_reader.hpp"
#include "kinetics/shipped_model_files.hpp"

namespace stillzone::kinetics {

namespace {

/// Models that extend models that extend models ...
constexpr int kMaxExtensions = 8;
constexpr std::uintmax_t kMaxFileSize = 4'000'000;

std::optional<core::JsonDocument> open_model(const core::JsonDocument& asking,
                                             const std::string& pointer, const std::string& written,
                                             core::FaultList& faults) {
  if (const std::string_view text = shipped_model_text(written); !text.empty()) {
    return core::JsonDocument::parse(text, written, asking.folder(), faults);
  }
  const auto add_fault = [&](std::string allowed, std::string way_out) {
    faults.add({.file = asking.name(),
                .pointer = pointer,
                .line = asking.line_of(pointer),
                .found = fmt::format("\"{}\"", written),
                .allowed = std::move(allowed),
                .way_out = std::move(way_out)});
    return std::nullopt;
  };
  const std::filesystem::path path = asking.folder() / written;
  std::error_code error;
  if (!std::filesystem::is_regular_file(path, error)) {
    return add_fault("no shipped model is called so, and there is no such file beside this one",
                     core::name_hint(written, shipped_models()));
  }
  const std::uintmax_t size = std::filesystem::file_size(path, error);
  if (error || size > kMaxFileSize) return add_fault("a model file has at most 4 MB", "");
  std::string text(static_cast<std::size_t>(size), '\0');
  std::ifstream stream(path, std::ios::binary);
  if (!stream.read(text.data(), static_cast<std::streamsize>(text.size()))) {
    return add_fault("the file cannot be read", "Check its permissions.");
  }
  return core::JsonDocument::parse(text, written, path.parent_path(), faults);
}

/// The document's root with the model it "extends" laid under it (JSON merge patch, RFC 7396: a
/// key replaces, null deletes).
std::optional<core::Json> with_base(const core::JsonDocument& document, core::FaultList& faults,
                                    int depth) {
  core::Json root = document.root();
  if (!root.is_object() || !root.contains("extends")) return root;
  const core::Json base = root["extends"];
  const auto add_fault = [&](std::string allowed) {
    faults.add({.file = document.name(),
                .pointer = "/extends",
                .line = document.line_of("/extends"),
                .found = core::shown(base),
                .allowed = std::move(allowed),
                .way_out = ""});
    return std::nullopt;
  };
  if (!base.is_string()) return add_fault("the name of a shipped model or a path is allowed");
  if (depth >= kMaxExtensions) {
    return add_fault(fmt::format("at most {} models may extend each other, and not in a circle",
                                 kMaxExtensions));
  }
  const auto base_document = open_model(document, "/extends", base.get<std::string>(), faults);
  if (!base_document) return std::nullopt;
  auto merged = with_base(*base_document, faults, depth + 1);
  if (!merged) return std::nullopt;
  if (!root.contains("stillzone")) merged->erase("stillzone");  // each file says what it is
  root.erase("extends");
  merged->merge_patch(root);
  return merged;
}

std::string model_name(const std::string& written) {
  return std::filesystem::path(written).stem().string();
}

std::optional<KineticModel> read_document(const core::ReadingContext& context,
                                          const core::ReadingContext& change_context,
                                          std::vector<ParameterChange> changes) {
  const auto root = with_base(context.document, context.faults, 0);
  if (!root) return std::nullopt;
  return ModelReader(context, *root, change_context, std::move(changes))
      .read(model_name(context.document.name()));
}

}  // namespace

KineticModel::KineticModel() = default;
KineticModel::~KineticModel() = default;
KineticModel::KineticModel(const KineticModel&) = default;
KineticModel& KineticModel::operator=(const KineticModel&) = default;
KineticModel::KineticModel(KineticModel&&) noexcept = default;
KineticModel& KineticModel::operator=(KineticModel&&) noexcept = default;

std::optional<std::size_t> KineticModel::component(std::string_view wanted) const {
  for (std::size_t i = 0; i < components.size(); ++i) {
    if (components[i].name == wanted) return i;
  }
  return std::nullopt;
}

std::optional<std::size_t> KineticModel::gas(std::string_view wanted) const {
  for (std::size_t g = 0; g < gases.size(); ++g) {
    if (gases[g].name == wanted) return g;
  }
  return std::nullopt;
}

double KineticModel::vapour_pressure(double temperature) const {
  SZ_REQUIRE(program != nullptr, "model \"{}\" was not read", name);
  std::vector<double> inputs(program->n_inputs(), 0.0);
  inputs[program->input_gas_temperature()] = temperature;
  return program->graph.evaluate(program->vapour_pressure, inputs);
}

std::vector<std::string> shipped_models() {
  std::vector<std::string> names;
  for (const ShippedModelFile& file : shipped_model_files()) names.emplace_back(file.name);
  return names;
}

std::string_view shipped_model_text(std::string_view name) {
  for (const ShippedModelFile& file : shipped_model_files()) {
    if (file.name == name) return file.text;
  }
  return {};
}

std::optional<KineticModel> load_model(const core::ReadingContext& context, const core::Json& node,
                                       const std::string& pointer) {
  const std::size_t n_faults_before = context.faults.all().size();
  std::string written;
  std::string written_at = pointer;
  std::vector<ParameterChange> changes;
  if (node.is_string()) {
    written = node.get<std::string>();
  } else if (node.is_object()) {
    core::ObjectReader reader(context, node, pointer);
    written = reader.text("model", core::ObjectReader::Need::required).value_or("");
    written_at = reader.pointer_to("model");
    reader.each_member(
        "set", core::ObjectReader::Need::optional,
        [&](const std::string& name, const core::Json& value, const std::string& at) {
          changes.push_back({name, &value, at});
        });
    reader.finish();
  } else {
    context.faults.add({.file = context.document.name(),
                        .pointer = pointer,
                        .line = context.document.line_of(pointer),
                        .found = core::shown(node),
                        .allowed = "the name of a shipped model, a path to a model file, or "
                                   "{\"model\": .., \"set\": {..}} is allowed",
                        .way_out = ""});
  }
  if (written.empty()) return std::nullopt;
  const auto document = open_model(context.document, written_at, written, context.faults);
  if (!document) return std::nullopt;
  const core::ReadingContext model_context{*document, context.units, context.faults,
                                           context.free_quantities};
  auto model = read_document(model_context, context, std::move(changes));
  if (context.faults.all().size() != n_faults_before) return std::nullopt;
  return model;
}

std::optional<KineticModel> read_model(const core::JsonDocument& document,
                                       const core::UnitReader& units, core::FaultList& faults) {
  std::vector<core::FreeQuantity> free_quantities;
  const core::ReadingContext context{document, units, faults, free_quantities};
  return read_document(context, context, {});
}

}  // namespace stillzone::kinetics
