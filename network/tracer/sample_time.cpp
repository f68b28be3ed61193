#include "network/tracer/sample_time.hpp"

#include <array>
#include <charconv>
#include <chrono>
#include <vector>

namespace stillzone::network {
namespace {

/// All numbers of a text, and the separators between them; empty when anything else stands there.
struct Numbers {
  std::vector<int> values;
  std::string separators;
};

std::optional<Numbers> split(std::string_view text) {
  Numbers numbers;
  while (!text.empty()) {
    int value = 0;
    const auto [end, error] = std::from_chars(text.data(), text.data() + text.size(), value);
    if (error != std::errc() || value < 0) return std::nullopt;
    numbers.values.push_back(value);
    text.remove_prefix(static_cast<std::size_t>(end - text.data()));
    if (text.empty()) break;
    if (std::string_view("-./: T").find(text.front()) == std::string_view::npos) {
      return std::nullopt;
    }
    numbers.separators += text.front();
    text.remove_prefix(1);
    if (text.empty()) return std::nullopt;
  }
  return numbers;
}

std::array<int, 3> year_month_day(const std::vector<int>& values, DateOrder order) {
  switch (order) {
    case DateOrder::day_first:
      return {values[2], values[1], values[0]};
    case DateOrder::month_first:
      return {values[2], values[0], values[1]};
    case DateOrder::year_first:
      break;
  }
  return {values[0], values[1], values[2]};
}

}  // namespace

std::optional<DateOrder> date_order_of(std::string_view name) {
  if (name == "year first") return DateOrder::year_first;
  if (name == "day first") return DateOrder::day_first;
  if (name == "month first") return DateOrder::month_first;
  return std::nullopt;
}

std::optional<double> read_date_time(std::string_view text, DateOrder order) {
  const auto numbers = split(text);
  if (!numbers) return std::nullopt;
  const std::vector<int>& values = numbers->values;
  if (values.size() != 3 && values.size() != 5 && values.size() != 6) return std::nullopt;
  const std::string& marks = numbers->separators;
  if (marks[0] != marks[1] || marks[0] == ':' || marks[0] == ' ') return std::nullopt;
  if (values.size() > 3 && ((marks[2] != ' ' && marks[2] != 'T') || marks[3] != ':')) {
    return std::nullopt;
  }
  const auto [year, month, day] = year_month_day(values, order);
  const std::chrono::year_month_day date{std::chrono::year(year),
                                         std::chrono::month(static_cast<unsigned>(month)),
                                         std::chrono::day(static_cast<unsigned>(day))};
  if (year < 1900 || year > 2200 || !date.ok()) return std::nullopt;
  const int hour = values.size() > 3 ? values[3] : 0;
  const int minute = values.size() > 3 ? values[4] : 0;
  const int second = values.size() > 5 ? values[5] : 0;
  if (hour > 24 || minute > 59 || second > 59) return std::nullopt;
  const auto days = std::chrono::sys_days(date).time_since_epoch().count();
  return static_cast<double>(days) + (hour + (minute + second / 60.0) / 60.0) / 24.0;
}

}  // namespace stillzone::network
