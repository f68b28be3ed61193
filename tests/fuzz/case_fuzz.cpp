// JSON document, case reader and flow balance.
#include "core/json_document.hpp"
#include "core/units.hpp"
#include "network/case.hpp"
#include "network/flow_balance.hpp"
#include "tests/fuzz/fuzz_support.hpp"

int LLVMFuzzerTestOneInput(const std::uint8_t* data, std::size_t size) {
  using namespace stillzone;
  static const core::UnitReader units;
  core::FaultList faults;
  const auto document = core::JsonDocument::parse(fuzz::text_of(data, size), "case.json",
                                                  "a-folder-that-is-not-there", faults);
  fuzz::promise(document.has_value() == faults.empty(), "a document or faults");
  if (!document) return 0;
  const auto the_case = network::read_case(*document, units, faults);
  fuzz::promise(the_case.has_value() == faults.empty(), "a case or faults");
  if (the_case) {
    const auto balance = network::FlowBalance::solve(*the_case, *document, faults);
    fuzz::promise(balance.has_value() == faults.empty(), "a balance or faults");
    if (balance) {
      const auto rates = balance->rates_at(*the_case, 0.0);
      fuzz::promise(rates.size() == balance->streams().size(), "one rate per stream");
    }
  }
  for (const auto& fault : faults.all()) fuzz::promise(!fault.found.empty(), "a fault says what");
  return 0;
}
