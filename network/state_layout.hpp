#pragma once

#include <cstddef>
#include <span>

#include "core/require.hpp"
#include "network/case.hpp"

namespace stillzone::network {

/// Where each unknown of a digester stands: the one owner of offsets.
///   zone 0: components, implicit unknowns; zone 1: ...; headspace 0: gases; headspace 1: ...
/// The zones' part is laid out as kinetics::ZoneKinetics takes it.
class StateLayout {
 public:
  explicit StateLayout(const Case& the_case)
      : n_zones_(the_case.zones.size()),
        n_headspaces_(the_case.headspaces.size()),
        n_components_(the_case.kinetics.components.size()),
        n_implicits_(the_case.kinetics.implicits.size()),
        n_gases_(the_case.kinetics.gases.size()) {}

  [[nodiscard]] std::size_t n_zones() const { return n_zones_; }
  [[nodiscard]] std::size_t n_headspaces() const { return n_headspaces_; }
  [[nodiscard]] std::size_t n_components() const { return n_components_; }
  [[nodiscard]] std::size_t n_implicits() const { return n_implicits_; }
  [[nodiscard]] std::size_t n_gases() const { return n_gases_; }
  [[nodiscard]] std::size_t n_zone_unknowns() const { return n_components_ + n_implicits_; }
  [[nodiscard]] std::size_t n_unknowns() const {
    return n_zones_ * n_zone_unknowns() + n_headspaces_ * n_gases_;
  }

  /// @param i < n_zone_unknowns: a component, or n_components + an implicit unknown.
  [[nodiscard]] std::size_t in_zone(std::size_t zone, std::size_t i) const {
    return zone * n_zone_unknowns() + i;
  }
  [[nodiscard]] std::size_t in_headspace(std::size_t headspace, std::size_t gas) const {
    return n_zones_ * n_zone_unknowns() + headspace * n_gases_ + gas;
  }

  /// All zones' unknowns, one zone's, one zone's components, one headspace's gases; of a vector of
  /// n_unknowns (double or const double).
  template <class T>
  [[nodiscard]] std::span<T> zones(std::span<T> y) const {
    return checked(y).first(n_zones_ * n_zone_unknowns());
  }
  template <class T>
  [[nodiscard]] std::span<T> zone(std::span<T> y, std::size_t zone) const {
    return checked(y).subspan(in_zone(zone, 0), n_zone_unknowns());
  }
  template <class T>
  [[nodiscard]] std::span<T> components(std::span<T> y, std::size_t zone) const {
    return checked(y).subspan(in_zone(zone, 0), n_components_);
  }
  template <class T>
  [[nodiscard]] std::span<T> gases(std::span<T> y, std::size_t headspace) const {
    return checked(y).subspan(in_headspace(headspace, 0), n_gases_);
  }

  /// What unknown k is.
  struct Position {
    bool in_zone = true;    ///< else in a headspace
    std::size_t place = 0;  ///< number of the zone or headspace
    std::size_t item = 0;   ///< component, n_components + implicit, or gas
  };
  [[nodiscard]] Position position(std::size_t k) const {
    SZ_REQUIRE(k < n_unknowns(), "unknown {} of {}", k, n_unknowns());
    const std::size_t of_zones = n_zones_ * n_zone_unknowns();
    if (k < of_zones) return {true, k / n_zone_unknowns(), k % n_zone_unknowns()};
    return {false, (k - of_zones) / n_gases_, (k - of_zones) % n_gases_};
  }

 private:
  template <class T>
  [[nodiscard]] std::span<T> checked(std::span<T> y) const {
    SZ_REQUIRE(y.size() == n_unknowns(), "{} values for {} unknowns", y.size(), n_unknowns());
    return y;
  }

  std::size_t n_zones_;
  std::size_t n_headspaces_;
  std::size_t n_components_;
  std::size_t n_implicits_;
  std::size_t n_gases_;
};

}  // namespace stillzone::network
