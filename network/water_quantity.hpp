#pragma once

#include <cstddef>
#include <optional>
#include <string_view>
#include <vector>

#include "network/case.hpp"
#include "network/flow_balance.hpp"

namespace stillzone::network {

/// A quantity of a case that moves its water: what a tracer can see.
struct WaterQuantity {
  enum class Kind { zone_volume, flow, share, feed_flow };
  Kind kind = Kind::zone_volume;
  std::size_t index = 0;  ///< of the zone, the flow, the flow, the feed
};
/// What a JSON pointer such as "/zones/core/volume", "/flows/3/flow", "/flows/0/share" or
/// "/feeds/sludge/flow" stands for; none for anything else.
[[nodiscard]] std::optional<WaterQuantity> water_quantity(const Case& the_case,
                                                          std::string_view pointer);
/// Sets it, in internal units.
void set_water_quantity(Case& the_case, const WaterQuantity& quantity, double value);

/// The zones, feeds, outlets, schedules and flows of a case, without its kinetics.
[[nodiscard]] Case water_of(const Case& the_case);

/// Mean stream rates and their exact derivatives in a few quantities.
struct RateSlopes {
  std::vector<double> rates;                ///< [m3/d] one per stream, schedules at their mean
  std::vector<std::vector<double>> slopes;  ///< per quantity: d rate / d quantity, one per stream
};
/// The flow equations are linear in the rates and affine in each given flow and share, so their
/// derivative is one more solution of the same equations. A quantity that is the last of shares
/// that must add up to 1 has no derivative of its own; such a case is refused when it is read.
[[nodiscard]] RateSlopes rate_slopes(const Case& water, std::span<const Stream> streams,
                                     std::span<const WaterQuantity> quantities);

}  // namespace stillzone::network
