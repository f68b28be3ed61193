#pragma once

#include <array>
#include <string>
#include <vector>

#include "kinetics/kinetic_model.hpp"
#include "kinetics/model_closing.hpp"

namespace stillzone::kinetics {

/// One balance of one process (or gas transfer).
struct Closure {
  /// What one unit of the process makes out of nothing, sum of coefficient x content; 0 = closed.
  double error = 0.0;
  /// Sum of the magnitudes: what is turned over. 0: the process does not touch what is balanced.
  double turnover = 0.0;
  /// |error| / turnover; 0 where nothing is turned over.
  [[nodiscard]] double relative() const;
};

/// COD, carbon, nitrogen and charge of one process, in the order of `Balance`.
struct ProcessAudit {
  std::string name;  ///< of the process; "transfer of S_gas_ch4" for a gas
  std::array<Closure, 4> closures;
};

struct ModelAudit {
  double temperature = 0.0;  ///< [K] at which coefficients were worked out
  std::vector<ProcessAudit> processes;

  /// Largest relative closure error of a balance over all processes and transfers.
  [[nodiscard]] double worst(Balance balance) const;
  /// Relative error above which a balance is not closed.
  static constexpr double kClosed = 1e-12;
};

/// Adds up what every process and every gas transfer of a model makes or loses. Charge is that of
/// the `holds` the file gives: a total that dissociates (inorganic carbon, an acid) counts as the
/// form it is written in, its ions being the charge balance's matter.
/// @param temperature [K]
[[nodiscard]] ModelAudit audit_model(const KineticModel& model, double temperature = 308.15);

}  // namespace stillzone::kinetics
