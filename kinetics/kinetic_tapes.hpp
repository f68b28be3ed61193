#pragma once

#include <cstddef>
#include <vector>

#include "kinetics/model_program.hpp"
#include "kinetics/tape.hpp"
#include "kinetics/zone_kinetics.hpp"

namespace stillzone::kinetics {

/// The tapes of one model. What depends on temperature, kLa and headspace temperature alone is
/// computed once per zone and conditions by `fixed`; the other tapes read it.
///
/// Rows: `fixed` reads {T, kLa, T_gas} and writes n_fixed values. All others read the zone's
/// unknowns (row 0), its headspace's gases (row 1) and its fixed values (row 2).
struct KineticTapes {
  explicit KineticTapes(const ModelProgram& program);

  static constexpr std::uint16_t kUnknowns = 0;
  static constexpr std::uint16_t kGases = 1;
  static constexpr std::uint16_t kFixed = 2;

  std::vector<KineticEntry> pattern;
  std::size_t n_fixed = 0;
  std::vector<Tape> tapes;  ///< in the order of Which
  enum Which : std::size_t {
    fixed,      ///< -> fixed values
    rates,      ///< -> source and implicit residuals (row 0), transfer (row 1)
    jacobian,   ///< -> values of the pattern's entries
    implicits,  ///< -> implicit residuals (row 0), their derivatives by the implicits (row 1)
    processes,  ///< -> process rates
    derived,    ///< -> derived quantities
  };
  [[nodiscard]] const Tape& operator[](Which which) const { return tapes[which]; }
  [[nodiscard]] std::size_t scratch_lines() const;
};

}  // namespace stillzone::kinetics
