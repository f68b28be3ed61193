#pragma once

#include <string>

namespace stillzone::testing {

/// A digester with every kind of flow (invented): a feed on a schedule and one on none, a share and
/// a rest, a bypass, one-way flows, recirculation, exchanges with and without schedule, two
/// headspaces, a zone without gas, several outlets, a zone of another temperature.
/// @param kinetics JSON; @param feed_state JSON object; @param run JSON object
[[nodiscard]] std::string every_flow_case(const std::string& kinetics,
                                          const std::string& feed_state, const std::string& run);

/// One tank with a headspace (invented), 3400 m3, fed 170 m3/d.
/// @param schedule of the feed: "" or , "schedule": "name" ; @param schedules JSON object
[[nodiscard]] std::string one_tank_case(const std::string& feed_extra, const std::string& schedules,
                                        const std::string& run);

/// A feed of sewage sludge for ADM1 (Rosen and Jeppsson 2006, rounded).
extern const char* const kSludge;

}  // namespace stillzone::testing
