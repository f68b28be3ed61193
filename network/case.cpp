#include "network/case.hpp"

#include "core/require.hpp"

namespace stillzone::network {

const std::string& Case::name_of(Place place) const {
  switch (place.kind) {
    case Place::Kind::zone:
      SZ_REQUIRE(place.index < zones.size(), "zone {} of {}", place.index, zones.size());
      return zones[place.index].name;
    case Place::Kind::feed:
      SZ_REQUIRE(place.index < feeds.size(), "feed {} of {}", place.index, feeds.size());
      return feeds[place.index].name;
    case Place::Kind::outlet:
      SZ_REQUIRE(place.index < outlets.size(), "outlet {} of {}", place.index, outlets.size());
      return outlets[place.index].name;
  }
  core::throw_defect("place.kind is known", __FILE__, __LINE__, "");
}

}  // namespace stillzone::network
