#pragma once

#include <optional>
#include <string>

#include "core/json_document.hpp"
#include "core/result.hpp"
#include "network/tracer/tracer_analysis.hpp"

namespace stillzone::network {

/// The feed of an emitted case: its name and what stands under it in a case's "feeds".
struct EmittedFeed {
  std::string name;
  core::Json block;
};

/// The fitted candidate as a case with biochemistry, as text with comments: zones, flows, gas,
/// kinetics "adm1", the feed (without one: a stated flow and an invented sludge to be replaced), a
/// steady run; fitted values with their standard errors as "spread" and their correlation as
/// "joint_spread".
///   real numbers of tanks: equal tanks and a smaller last one with the same mean and variance
///   dispersion: equal tanks with back-flow of the same mean and variance
///   plug section: ten equal tanks in a row (its variance then is a tenth of its length squared)
///   dead volume: left out; a comment says how much
/// Failure: fewer than one tank in series; a Peclet number that would need more than 30 zones.
[[nodiscard]] core::Result<std::string> emitted_case(const TracerTest& test, const ModelFit& fit,
                                                     const std::optional<EmittedFeed>& feed);

/// A user's network with its fitted values in place.
[[nodiscard]] std::string emitted_network(const core::Json& user_case, const ModelFit& fit);

}  // namespace stillzone::network
