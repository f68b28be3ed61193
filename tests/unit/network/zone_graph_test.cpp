#include "network/zone_graph.hpp"

#include <gmock/gmock.h>
#include <gtest/gtest.h>

#include <array>

namespace stillzone::network {
namespace {

using ::testing::ElementsAre;

TEST(ZoneGraph, WaterReachesWhatLinksLeadTo) {
  const std::array<Link, 3> links = {Link{0, 1}, Link{1, 2}, Link{3, 2}};
  const ZoneGraph graph(4, links);
  const std::array<std::size_t, 1> start = {0};
  EXPECT_THAT(graph.reached_from(start), ElementsAre(true, true, true, false));
}

TEST(ZoneGraph, WaterLeadsToAnEndAgainstTheLinks) {
  const std::array<Link, 3> links = {Link{0, 1}, Link{1, 2}, Link{2, 3}};
  const ZoneGraph graph(5, links);
  const std::array<std::size_t, 1> end = {2};
  EXPECT_THAT(graph.leading_to(end), ElementsAre(true, true, true, false, false));
}

TEST(ZoneGraph, ARecirculationIsALoopAndAChainIsNone) {
  const std::array<Link, 5> links = {Link{0, 1}, Link{1, 2}, Link{2, 1}, Link{2, 3}, Link{4, 4}};
  const ZoneGraph graph(5, links);
  ASSERT_EQ(graph.loops().size(), 1U);
  EXPECT_THAT(graph.loops()[0], ElementsAre(1U, 2U));
}

TEST(ZoneGraph, PartsAreNumberedByTheirFirstPlace) {
  const std::array<Link, 2> links = {Link{3, 0}, Link{2, 1}};
  const ZoneGraph graph(5, links);
  EXPECT_THAT(graph.parts(), ElementsAre(0U, 1U, 1U, 0U, 2U));
}

TEST(ZoneGraph, WithoutPlacesThereIsNothing) {
  const ZoneGraph graph(0, {});
  EXPECT_TRUE(graph.parts().empty());
  EXPECT_TRUE(graph.loops().empty());
}

}  // namespace
}  // namespace stillzone::network
