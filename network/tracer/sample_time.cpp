#include "network/tracer/sample_time.hpp"

#include <fmt/format.h>

#include <array>
#include <charconv>
#include <chrono>
#include <cmath>
#include <vector>

namespace stillzone::network {
namespace {

constexpr std::array<DateOrder, 3> kOrders = {DateOrder::year_first, DateOrder::day_first,
                                              DateOrder::month_first};

bool is_digit(char c) { return c >= '0' && c <= '9'; }

std::string_view trimmed(std::string_view text) {
  while (!text.empty() && text.front() == ' ') text.remove_prefix(1);
  while (!text.empty() && text.back() == ' ') text.remove_suffix(1);
  return text;
}

/// All numbers of a text, and the separators between them; empty when anything else stands there.
struct Numbers {
  std::vector<int> values;
  std::string separators;
};

std::optional<Numbers> split(std::string_view text) {
  constexpr std::size_t kMostDigits = 4;
  Numbers numbers;
  while (!text.empty()) {
    std::size_t n = 0;
    while (n < text.size() && is_digit(text[n])) ++n;
    if (n == 0 || n > kMostDigits) return std::nullopt;
    int value = 0;
    (void)std::from_chars(text.data(), text.data() + n, value);
    numbers.values.push_back(value);
    text.remove_prefix(n);
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

/// Takes ".25" off the seconds of a time (two colons before it). @return [s]
double take_fraction(std::string_view& text) {
  const auto colon = text.rfind(':');
  const auto point = text.rfind('.');
  if (colon == std::string_view::npos || point == std::string_view::npos || point < colon ||
      text.find(':') == colon) {
    return 0.0;
  }
  double fraction = 0.0;
  const char* const end = text.data() + text.size();
  const auto read = std::from_chars(text.data() + point, end, fraction, std::chars_format::fixed);
  if (read.ec != std::errc() || read.ptr != end) return 0.0;
  text.remove_suffix(text.size() - point);
  return fraction;
}

enum class HalfDay { none, am, pm };
HalfDay take_half_day(std::string_view& text) {
  if (text.size() < 3 || (text.back() != 'M' && text.back() != 'm')) return HalfDay::none;
  const char letter = text[text.size() - 2];
  HalfDay half = HalfDay::none;
  if (letter == 'A' || letter == 'a') half = HalfDay::am;
  if (letter == 'P' || letter == 'p') half = HalfDay::pm;
  if (half == HalfDay::none) return half;
  text.remove_suffix(2);
  text = trimmed(text);
  return half;
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

/// True for "d-d-d", "d-d-d d:d" and "d-d-dTd:d:d", the date with one mark throughout.
bool well_separated(const std::string& marks) {
  if (marks.size() != 2 && marks.size() != 4 && marks.size() != 5) return false;
  if (marks[0] != marks[1] || std::string_view("-./").find(marks[0]) == std::string_view::npos) {
    return false;
  }
  if (marks.size() == 2) return true;
  return (marks[2] == ' ' || marks[2] == 'T') && marks.find_first_not_of(':', 3) == marks.npos;
}

/// Time of day [d]; empty for a time that no clock shows. 24:00 is the end of the day.
std::optional<double> time_of_day(const std::vector<int>& values, HalfDay half, double fraction) {
  int hour = values.size() > 3 ? values[3] : 0;
  const int minute = values.size() > 3 ? values[4] : 0;
  const int second = values.size() > 5 ? values[5] : 0;
  if (half != HalfDay::none) {
    if (values.size() <= 3 || hour < 1 || hour > 12) return std::nullopt;
    hour = hour % 12 + (half == HalfDay::pm ? 12 : 0);
  }
  if (hour > 24 || minute > 59 || second > 59) return std::nullopt;
  const double seconds = 3600.0 * hour + 60.0 * minute + second + fraction;
  if (seconds > 86400.0) return std::nullopt;
  return seconds / 86400.0;
}

}  // namespace

std::optional<DateOrder> date_order_of(std::string_view name) {
  for (const DateOrder order : kOrders) {
    if (date_order_name(order) == name) return order;
  }
  return std::nullopt;
}

std::string date_order_name(DateOrder order) {
  switch (order) {
    case DateOrder::day_first:
      return "day first";
    case DateOrder::month_first:
      return "month first";
    case DateOrder::year_first:
      break;
  }
  return "year first";
}

std::optional<double> read_date_time(std::string_view text, DateOrder order) {
  text = trimmed(text);
  const HalfDay half = take_half_day(text);
  const double fraction = take_fraction(text);
  const auto numbers = split(text);
  if (!numbers || !well_separated(numbers->separators)) return std::nullopt;
  const auto [year, month, day] = year_month_day(numbers->values, order);
  // Checked before the calendar's types, which keep eight bits only.
  if (year < 1900 || year > 2200 || month < 1 || month > 12 || day < 1 || day > 31) {
    return std::nullopt;
  }
  const std::chrono::year_month_day date{std::chrono::year(year),
                                         std::chrono::month(static_cast<unsigned>(month)),
                                         std::chrono::day(static_cast<unsigned>(day))};
  if (!date.ok()) return std::nullopt;
  const auto time = time_of_day(numbers->values, half, fraction);
  if (!time) return std::nullopt;
  return static_cast<double>(std::chrono::sys_days(date).time_since_epoch().count()) + *time;
}

std::optional<std::string> serial_day(double number) {
  constexpr double kFirst = 18264.0;         // 1950-01-01
  constexpr double kLast = 73050.0;          // 2099-12-31
  constexpr int kSerialOfFirst1970 = 25569;  // 1970-01-01
  if (!(number >= kFirst && number <= kLast)) return std::nullopt;
  const long minutes = std::lround(1440.0 * number);
  const std::chrono::sys_days day{
      std::chrono::days(static_cast<int>(minutes / 1440) - kSerialOfFirst1970)};
  const std::chrono::year_month_day date(day);
  return fmt::format("{}-{:02}-{:02} {:02}:{:02}", static_cast<int>(date.year()),
                     static_cast<unsigned>(date.month()), static_cast<unsigned>(date.day()),
                     minutes % 1440 / 60, minutes % 60);
}

std::string date_time_way_out(std::string_view text, DateOrder order) {
  text = trimmed(text);
  double number = 0.0;
  std::string plain(text);
  if (const auto comma = plain.find(','); comma != std::string::npos) plain[comma] = '.';
  const auto read = std::from_chars(plain.data(), plain.data() + plain.size(), number);
  if (read.ec == std::errc() && read.ptr == plain.data() + plain.size()) {
    if (const auto day = serial_day(number)) {
      return fmt::format(
          "This is a spreadsheet's day number (it stands for {}): give the column the format "
          "yyyy-mm-dd hh:mm and export it again.",
          *day);
    }
    return "This is a plain number: give the column a date format and export it again, or use "
           "\"unit\" for elapsed time.";
  }
  for (const DateOrder other : kOrders) {
    if (other != order && read_date_time(text, other)) {
      return fmt::format("It can be read \"{}\": correct \"dates\", or this cell.",
                         date_order_name(other));
    }
  }
  if (text.size() > 11 && (text.back() == 'Z' || text.find('+', 10) != std::string_view::npos)) {
    return "Take the time zone off: all times of a test are one clock.";
  }
  return fmt::format("Write a time {} with a year of four digits, such as {}.",
                     date_order_name(order),
                     order == DateOrder::year_first  ? "2026-03-02 14:30"
                     : order == DateOrder::day_first ? "02.03.2026 14:30"
                                                     : "3/2/2026 2:30 PM");
}

}  // namespace stillzone::network
