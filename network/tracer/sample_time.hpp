#pragma once

#include <optional>
#include <string>
#include <string_view>

namespace stillzone::network {

/// A point in time as a laboratory writes it, as days since 1970-01-01 00:00 (no time zones, no
/// summer time: all times of a test are taken as one clock). Understood: "2026-03-02 14:30",
/// "2026-03-02T14:30:05", "2026-03-02", "02.03.2026 14:30", "02/03/2026 14:30" with an explicit
/// order "day first" or "month first". Empty when the text is no such time or no such day exists.
enum class DateOrder { year_first, day_first, month_first };
[[nodiscard]] std::optional<double> read_date_time(std::string_view text, DateOrder order);

/// "year first", "day first", "month first".
[[nodiscard]] std::optional<DateOrder> date_order_of(std::string_view name);

}  // namespace stillzone::network
