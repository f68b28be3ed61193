#pragma once

#include "network/tracer/model_fit.hpp"

namespace stillzone::network {

/// Sets `identified` and the plain words from the value, its bounds and its interval: identified
/// when both ends lie inside the bounds and no further apart than twice the value (common practice,
/// no source).
void judge_parameter(FittedParameter& parameter);

/// Adds what this test cannot tell to the fit's remarks: parameters that only move together,
/// undetermined combinations, starts that disagree.
/// @param ambiguous other values, elsewhere, fit equally well
void add_remarks(bool singular, bool ambiguous, ModelFit& fit);

}  // namespace stillzone::network
