#pragma once

#include <optional>
#include <string>
#include <string_view>

namespace stillzone::network {

/// A point in time as a laboratory writes it, as days since 1970-01-01 00:00 (no time zones, no
/// summer time: all times of a test are taken as one clock). Understood: "2026-03-02 14:30",
/// "2026-03-02T14:30:05.5", "2026-03-02", "02.03.2026 14:30", "3/2/2026 2:30 PM", in the order
/// stated. Empty when the text is no such time or no such day exists.
enum class DateOrder { year_first, day_first, month_first };
[[nodiscard]] std::optional<double> read_date_time(std::string_view text, DateOrder order);

/// "year first", "day first", "month first".
[[nodiscard]] std::optional<DateOrder> date_order_of(std::string_view name);
[[nodiscard]] std::string date_order_name(DateOrder order);

/// Next step, a sentence, for a text that read_date_time refuses: a spreadsheet's day number, a
/// date that another order would accept, a year of two digits, a time zone.
[[nodiscard]] std::string date_time_way_out(std::string_view text, DateOrder order);

/// The day a spreadsheet's serial number stands for (days since 1899-12-30), for messages:
/// 46083.25 -> "2026-03-02 06:00". Empty outside 1950 to 2100.
[[nodiscard]] std::optional<std::string> serial_day(double number);

}  // namespace stillzone::network
