#pragma once

#include <compare>
#include <cstddef>

namespace stillzone::core {

/// An index that only fits the list it was made for: a ZoneIndex is no FlowIndex.
template <class Tag>
class Index {
 public:
  constexpr Index() = default;
  explicit constexpr Index(std::size_t value) : value_(value) {}
  [[nodiscard]] constexpr std::size_t value() const { return value_; }
  constexpr auto operator<=>(const Index&) const = default;

 private:
  std::size_t value_ = 0;
};

}  // namespace stillzone::core
