#pragma once

#include <optional>
#include <string>
#include <vector>

#include "network/tracer/model_fit.hpp"
#include "network/tracer/tracer_test.hpp"

namespace stillzone::cli {

/// A unit with raised figures, "m3/d" as it is written by hand; "1" as nothing.
[[nodiscard]] std::string unit_shown(const std::string& unit);

/// A range as people read it: "31 to 38 %", "at most 38 %", "at least 31 %"; without an end
/// "about 34 % (not held by this test)". As many decimals as its width needs.
/// @param unit after the numbers; empty: none
[[nodiscard]] std::string range_in_words(std::optional<double> low, std::optional<double> high,
                                         double value, const std::string& unit);

/// A parameter's 95 % interval in other terms: ends times factor, or (1 - end) times factor.
[[nodiscard]] std::string interval_in_words(const network::FittedParameter& parameter,
                                            double factor, const std::string& unit,
                                            bool complement = false);

/// Whether a fit is of a network of the user's own, which is known by its file alone and may bear
/// any name.
[[nodiscard]] bool is_own_network(const network::ModelFit& fit);

/// What a fitted model says of the tank, as half a sentence of HTML with its 95 % intervals: "31 to
/// 38 % of the nominal volume stands still, exchanging 41 to 54 m3/d with the mixed rest". User
/// networks: their fitted quantities one by one.
[[nodiscard]] std::string model_in_words(const network::ModelFit& fit,
                                         const network::TracerTest& test);

/// A sentence of the analysis as HTML: escaped, with raised figures and plus-minus signs.
[[nodiscard]] std::string prose(const std::string& sentence);
/// Sentences as a list.
[[nodiscard]] std::string prose_list(const std::vector<std::string>& sentences);

/// "18.2 +- 0.4 d"; without an error (not finite, or not > 0) the value alone.
[[nodiscard]] std::string with_error(double value, double error, const std::string& unit);

}  // namespace stillzone::cli
