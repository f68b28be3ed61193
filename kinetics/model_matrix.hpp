#pragma once

#include <cstddef>
#include <string>
#include <vector>

#include "kinetics/kinetic_model.hpp"

namespace stillzone::kinetics {

/// A coefficient of the Petersen matrix: as written and as a number.
struct MatrixEntry {
  std::size_t component = 0;
  std::string written;  ///< "1 - Y_ac", "closes C"
  double value = 0.0;   ///< [unit of the component per unit of the process]
};
struct MatrixRow {
  std::string process;
  std::string meaning;
  std::string rate;  ///< as written
  std::vector<MatrixEntry> entries;
};
struct NamedExpression {
  std::string name;
  std::string text;
};
struct ParameterRow {
  std::string name;
  std::string unit;
  std::string meaning;
  std::string source;
  std::string law;              ///< temperature law in words; empty when there is none
  double reference = 0.0;       ///< value at the law's reference temperature
  double at_temperature = 0.0;  ///< value at the matrix's temperature
};

/// A model laid out for reading: what `stillzone model` prints. Components with their contents are
/// in the model itself, its audit in kinetics/model_audit.hpp.
struct ModelMatrix {
  double temperature = 0.0;  ///< [K]
  std::vector<MatrixRow> rows;
  std::vector<NamedExpression> terms;
  std::vector<NamedExpression> equations;  ///< of the implicit unknowns
  std::vector<NamedExpression> transfers;  ///< of the gases [gas unit per m3 of liquid and d]
  std::vector<ParameterRow> parameters;
};

/// @param temperature [K] at which coefficients and parameters are worked out
[[nodiscard]] ModelMatrix model_matrix(const KineticModel& model, double temperature = 308.15);

}  // namespace stillzone::kinetics
