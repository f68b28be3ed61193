#pragma once

#include <cstddef>
#include <map>
#include <memory>
#include <optional>
#include <span>
#include <string>
#include <string_view>
#include <utility>
#include <vector>

#include "core/fault.hpp"
#include "core/json_document.hpp"
#include "core/json_reader.hpp"

namespace stillzone::kinetics {

enum class Phase { dissolved, particulate };

/// What one unit of a component holds of what is conserved.
struct Content {
  double cod = 0.0;       ///< [kg COD per unit]
  double carbon = 0.0;    ///< [kmol C per unit]
  double nitrogen = 0.0;  ///< [kmol N per unit]
  double charge = 0.0;    ///< [kmol charge per unit], of the form the charge balance counts
};

struct Component {
  std::string name;  ///< as published: "S_ac"
  std::string unit;  ///< "kg COD/m3"
  std::string meaning;
  Phase phase = Phase::dissolved;
  Content content;
  double floor = 1e-6;  ///< magnitude below which its relative error does not matter, in its unit
  double seed = 0.0;    ///< value in the model's healthy inoculum
};

/// An unknown found from an algebraic equation, such as pH from the charge balance.
struct Implicit {
  std::string name;
  std::string unit;
  std::string meaning;
  double start = 0.0;  ///< first guess
  double low = 0.0;    ///< the root is sought in [low, high]
  double high = 0.0;
};

/// A gas of the headspace, by the concentration the model uses; partial pressure by the ideal gas
/// law: p [bar] = concentration * kmol_per_unit * R * T.
struct Gas {
  std::string name;  ///< "S_gas_ch4"
  std::string unit;
  std::string meaning;
  Content content;
  double kmol_per_unit = 0.0;
  double floor = 1e-6;
  double seed = 0.0;
  std::string role;  ///< "methane", "carbon_dioxide", "hydrogen", "hydrogen_sulfide" or empty
};

/// A quantity worth showing that follows from a zone's state: VFA, alkalinity, free ammonia.
struct Derived {
  std::string name;
  std::string unit;
  std::string meaning;
};

/// A microbial group, for washout work: its component and the process that grows it.
struct Group {
  std::string name;  ///< "acetate degraders"
  std::size_t component = 0;
};

struct ModelProgram;  // compiled expressions; kinetics/model_program.hpp

/// A kinetic model read from text: components, implicit unknowns, gases, processes. Immutable after
/// loading; shared by all zones and threads.
class KineticModel {
 public:
  KineticModel();
  ~KineticModel();
  KineticModel(KineticModel&&) noexcept;
  KineticModel& operator=(KineticModel&&) noexcept;
  KineticModel(const KineticModel&);
  KineticModel& operator=(const KineticModel&);

  std::string name;
  std::string title;
  std::string source;
  std::vector<Component> components;
  std::vector<Implicit> implicits;
  std::vector<Gas> gases;
  std::vector<Derived> derived;
  std::vector<Group> groups;
  std::string vfa;                 ///< name of the derived quantity that is the VFA; may be empty
  double gas_constant = 0.083145;  ///< [bar m3 / kmol / K]
  /// [K] Temperatures for which the model's rates hold; empty when its file does not say.
  std::optional<std::pair<double, double>> temperature_range;
  std::vector<std::string> caveats;  ///< what the model's own file says of its limits
  /// Immutable, and shared by copies of the model (the ideal tank beside a network).
  std::shared_ptr<const ModelProgram> program;

  [[nodiscard]] std::optional<std::size_t> component(std::string_view name) const;
  [[nodiscard]] std::optional<std::size_t> gas(std::string_view name) const;
  /// Unknowns of one zone: components, then implicits.
  [[nodiscard]] std::size_t n_zone_unknowns() const { return components.size() + implicits.size(); }
  /// Saturated water vapour pressure at a headspace temperature [K] -> [bar].
  [[nodiscard]] double vapour_pressure(double temperature) const;
};

/// Names of the models compiled into the program.
[[nodiscard]] std::vector<std::string> shipped_models();
/// Text of a shipped model's file; empty when there is none of that name.
[[nodiscard]] std::string_view shipped_model_text(std::string_view name);

/// Loads what a case's "kinetics" key says: a shipped name, a path to a model file (relative to the
/// case), or {"model": .., "set": {parameter: "value unit"}}. Faults go to the context's list,
/// those inside a model file with that file's name. Nothing is returned when there was a fault.
/// Free parameters ({"value", "fit"/"spread"} in "set") join the context's free quantities.
[[nodiscard]] std::optional<KineticModel> load_model(const core::ReadingContext& context,
                                                     const core::Json& node,
                                                     const std::string& pointer);
/// The same for a model document alone (`stillzone model FILE`).
[[nodiscard]] std::optional<KineticModel> read_model(const core::JsonDocument& document,
                                                     const core::UnitReader& units,
                                                     core::FaultList& faults);

}  // namespace stillzone::kinetics
