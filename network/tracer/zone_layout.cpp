#include "network/tracer/zone_layout.hpp"

#include <fmt/format.h>

#include <algorithm>
#include <boost/math/tools/roots.hpp>
#include <cmath>
#include <utility>

#include "network/tracer/rtd_candidates.hpp"

namespace stillzone::network {
namespace {

using Number = ZoneLayout::Number;
constexpr std::size_t kMostZones = 30;
constexpr std::size_t kPlugTanks = 10;

Number parameter(const ModelFit& fit, std::size_t j) {
  return Number::variable(fit.parameters[j].value, j, 1.0);
}

/// Zones in a row: feed -> tank1 -> ... -> overflow.
void add_row(const std::vector<Number>& volumes, ZoneLayout& layout) {
  std::string before = "feed";
  for (std::size_t i = 0; i < volumes.size(); ++i) {
    const std::string name = fmt::format("tank{}", i + 1);
    layout.zones.push_back({.name = name, .volume = volumes[i], .still = false});
    layout.flows.push_back(
        {.from = before, .to = name, .exchange = false, .flow = {}, .share = {}});
    before = name;
  }
  layout.flows.push_back(
      {.from = before, .to = "overflow", .exchange = false, .flow = {}, .share = {}});
}

void add_exchange(const std::string& a, const std::string& b, const Number& flow,
                  ZoneLayout& layout) {
  layout.flows.push_back({.from = a, .to = b, .exchange = true, .flow = flow, .share = {}});
}

/// Shares of n tanks that have the mean and variance of a real number N of equal ones:
///   n - 1 of share a, one of b:  (n-1) a + b = 1,  (n-1) a^2 + b^2 = 1/N,  n = N rounded up
core::Result<std::vector<Number>> tank_shares(const Number& tanks) {
  const double wanted = tanks.value;
  if (wanted < 1.0 - 1e-9) {
    return core::Failure{
        .reason = fmt::format("{:.3g} tanks in series cannot be built from zones: fewer than one "
                              "means more spread than a mixed tank has",
                              wanted),
        .try_this = "Emit a model with a stagnant zone or two paths instead."};
  }
  const double n = std::max(1.0, std::ceil(wanted - 1e-6));
  if (n > static_cast<double>(kMostZones)) {
    return core::Failure{
        .reason = fmt::format("{:.1f} tanks in series need more than {} zones", wanted, kMostZones),
        .try_this = "Emit another model, or write the case by hand."};
  }
  const auto count = static_cast<std::size_t>(n);
  if (count == 1 || n - wanted < 1e-6) return std::vector<Number>(count, Number(1.0 / n));
  const Number root =
      sqrt(Number(1.0) - Number(n / (n - 1.0)) * (Number(1.0) - Number(1.0) / tanks));
  const Number a = (Number(1.0) + root) / Number(n);
  std::vector<Number> shares(count, a);
  shares.back() = Number(1.0) - Number(n - 1.0) * a;
  return shares;
}

/// Variance over mean squared of n equal tanks in a row with back-flow beta times the forward flow
/// between neighbours: from the moments of the chain (checked in a test against its network).
Number cascade_variance(double n, const Number& beta) {
  const Number one(1.0);
  const Number ratio = beta / (one + beta);
  const Number power = exp(Number(n) * log(ratio));
  return (one + Number(2.0) * beta) / Number(n) -
         Number(2.0) * beta * (one + beta) / Number(n * n) * (one - power);
}

core::Result<ZoneLayout> dispersion_layout(const ModelFit& fit, double flow) {
  const Number volume = parameter(fit, 0);
  const Number peclet = parameter(fit, 1);
  const Number variance = Number(2.0) / peclet * (Number(1.0) + expm1(-peclet) / peclet);
  const double n = std::max(4.0, std::ceil(1.25 / variance.value));
  if (n > static_cast<double>(kMostZones)) {
    return core::Failure{.reason = fmt::format("a Peclet number of {:.3g} needs {:.0f} zones; at "
                                               "most {} are laid out",
                                               peclet.value, n, kMostZones),
                         .try_this = "Emit tanks_in_series or plug_tank instead."};
  }
  const auto excess = [&](double x) {
    return cascade_variance(n, Number(std::exp(x))).value - variance.value;
  };
  std::uintmax_t most = 200;
  const auto [low, high] = boost::math::tools::toms748_solve(
      excess, std::log(1e-6), std::log(1e6), boost::math::tools::eps_tolerance<double>(50), most);
  const double beta_value = std::exp(0.5 * (low + high));
  // d beta / d Pe by the implicit function theorem.
  const Number along = cascade_variance(n, Number::variable(beta_value, 0, 1.0));
  const Number beta = variance.mapped(beta_value, 1.0 / along.d[0]);
  ZoneLayout layout;
  add_row(std::vector<Number>(static_cast<std::size_t>(n), volume / Number(n)), layout);
  for (std::size_t i = 0; i + 1 < layout.zones.size(); ++i) {
    add_exchange(layout.zones[i].name, layout.zones[i + 1].name, beta * Number(flow), layout);
  }
  return layout;
}

/// Tanks in a row, each with its share of the stagnant volume and of the exchange.
void add_still_zones(const std::vector<Number>& shares, const Number& still, const Number& exchange,
                     ZoneLayout& layout) {
  for (std::size_t i = 0; i < shares.size(); ++i) {
    const std::string name = fmt::format("still{}", i + 1);
    layout.zones.push_back({.name = name, .volume = shares[i] * still, .still = true});
    add_exchange(layout.zones[i].name, name, shares[i] * exchange, layout);
  }
}

core::Result<ZoneLayout> series_layout(const ModelFit& fit, double volume, bool with_still) {
  const auto shares = tank_shares(parameter(fit, with_still ? 0 : 1));
  if (!shares) return shares.failure();
  const Number mixed = with_still ? parameter(fit, 1) * Number(volume) : parameter(fit, 0);
  std::vector<Number> volumes;
  for (const Number& share : shares.value()) volumes.push_back(share * mixed);
  ZoneLayout layout;
  add_row(volumes, layout);
  if (with_still) {
    add_still_zones(shares.value(), Number(volume) - mixed, parameter(fit, 2), layout);
  }
  return layout;
}

ZoneLayout bypass_layout(const ModelFit& fit, double volume) {
  ZoneLayout layout;
  layout.zones.push_back(
      {.name = "core", .volume = parameter(fit, 0) * Number(volume), .still = false});
  if (fit.parameters[1].value > 0.0) {
    layout.flows.push_back({.from = "feed",
                            .to = "overflow",
                            .exchange = false,
                            .flow = {},
                            .share = parameter(fit, 1)});
  }
  layout.flows.push_back(
      {.from = "feed", .to = "core", .exchange = false, .flow = {}, .share = {}});
  layout.flows.push_back(
      {.from = "core", .to = "overflow", .exchange = false, .flow = {}, .share = {}});
  return layout;
}

ZoneLayout exchange_layout(const ModelFit& fit, double volume) {
  ZoneLayout layout;
  const Number mixed = parameter(fit, 0) * Number(volume);
  layout.zones.push_back({.name = "core", .volume = mixed, .still = false});
  layout.zones.push_back({.name = "still", .volume = Number(volume) - mixed, .still = true});
  layout.flows.push_back(
      {.from = "feed", .to = "core", .exchange = false, .flow = {}, .share = {}});
  layout.flows.push_back(
      {.from = "core", .to = "overflow", .exchange = false, .flow = {}, .share = {}});
  add_exchange("core", "still", parameter(fit, 1), layout);
  return layout;
}

ZoneLayout plug_layout(const ModelFit& fit) {
  const Number volume = parameter(fit, 0);
  const Number plug = volume * parameter(fit, 1);
  std::vector<Number> volumes;
  if (fit.parameters[1].value > 0.0) {
    volumes.assign(kPlugTanks, plug / Number(static_cast<double>(kPlugTanks)));
  }
  volumes.push_back(volume - plug);
  ZoneLayout layout;
  add_row(volumes, layout);
  layout.notes.push_back(
      fmt::format("the plug section stands here as {} tanks in a row: a front that is somewhat "
                  "blunter than the fitted one",
                  kPlugTanks));
  return layout;
}

ZoneLayout parallel_layout(const ModelFit& fit) {
  ZoneLayout layout;
  const Number volume = parameter(fit, 0);
  const Number fast = parameter(fit, 2);
  layout.zones.push_back({.name = "fast", .volume = volume * fast, .still = false});
  layout.zones.push_back({.name = "slow", .volume = volume * (Number(1.0) - fast), .still = false});
  layout.flows.push_back(
      {.from = "feed", .to = "fast", .exchange = false, .flow = {}, .share = parameter(fit, 1)});
  layout.flows.push_back(
      {.from = "feed", .to = "slow", .exchange = false, .flow = {}, .share = {}});
  for (const char* zone : {"fast", "slow"}) {
    layout.flows.push_back(
        {.from = zone, .to = "overflow", .exchange = false, .flow = {}, .share = {}});
  }
  return layout;
}

core::Result<ZoneLayout> layout_by_name(const ModelFit& fit, double volume, double flow) {
  if (fit.name == "tanks_in_series") return series_layout(fit, volume, false);
  if (fit.name == "series_stagnant") return series_layout(fit, volume, true);
  if (fit.name == "bypass_dead") return bypass_layout(fit, volume);
  if (fit.name == "stagnant_exchange") return exchange_layout(fit, volume);
  if (fit.name == "plug_tank") return plug_layout(fit);
  if (fit.name == "parallel_paths") return parallel_layout(fit);
  if (fit.name == "dispersion") return dispersion_layout(fit, flow);
  SZ_REQUIRE(fit.name == "one_tank", "no layout for {}", fit.name);
  ZoneLayout layout;
  add_row({parameter(fit, 0)}, layout);
  return layout;
}

}  // namespace

core::Result<ZoneLayout> zone_layout(const ModelFit& fit, double volume, double flow) {
  auto layout = layout_by_name(fit, volume, flow);
  if (!layout) return layout;
  double used = 0.0;
  for (const ZoneLayout::Zone& zone : layout.value().zones) used += zone.volume.value;
  if (used < 0.995 * volume) {
    layout.value().notes.push_back(
        fmt::format("{:.4g} m3 of the nominal {:.4g} m3 take no part in the flow and stand in no "
                    "zone: dead volume",
                    volume - used, volume));
  } else if (used > 1.005 * volume) {
    layout.value().notes.push_back(
        fmt::format("the fit uses {:.4g} m3, more than the nominal {:.4g} m3: check volume and "
                    "flow of the test",
                    used, volume));
  }
  return layout;
}

}  // namespace stillzone::network
