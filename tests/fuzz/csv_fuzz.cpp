// CSV table: reading, and reading again what was written.
#include <cmath>
#include <cstdlib>
#include <string>

#include "core/csv_table.hpp"
#include "tests/fuzz/fuzz_support.hpp"

int LLVMFuzzerTestOneInput(const std::uint8_t* data, std::size_t size) {
  using namespace stillzone;
  core::FaultList faults;
  const auto table = core::CsvTable::parse(fuzz::text_of(data, size), "table.csv", faults);
  fuzz::promise(table.has_value() == faults.empty(), "a table or faults");
  if (!table) return 0;
  core::FaultList of_numbers;
  for (std::size_t row = 0; row < table->n_rows(); ++row) {
    for (std::size_t column = 0; column < table->header().size(); ++column) {
      static_cast<void>(core::csv_cell(table->cell(row, column)));
      const auto number = table->number(row, column, of_numbers);
      if (!number) continue;
      fuzz::promise(std::isfinite(*number), "numbers are finite");
      const std::string written = core::csv_number(*number);
      const double difference = std::strtod(written.c_str(), nullptr) - *number;
      fuzz::promise(std::abs(difference) <= 0.0, "a written number reads back");
    }
  }
  return 0;
}
