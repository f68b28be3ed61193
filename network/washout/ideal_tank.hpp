#pragma once

#include "network/case.hpp"

namespace stillzone::network {

/// The ideal tank beside a network: one mixed zone "tank" that holds the volume of all zones and
/// gets all feeds (those that bypass the zones included), one outlet "outlet". Its temperature is
/// the zones' mean by volume; its kLa that of the zones with gas exchange, by volume; its one
/// headspace "gas" has the volume and the pipe coefficient of all headspaces together and their
/// mean pressures and temperature by volume. Model, feeds and start are those of the case.
[[nodiscard]] Case ideal_tank(const Case& the_case);

}  // namespace stillzone::network
