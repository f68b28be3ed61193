// Model reader, with its expressions.
#include "core/json_document.hpp"
#include "core/units.hpp"
#include "kinetics/kinetic_model.hpp"
#include "tests/fuzz/fuzz_support.hpp"

int LLVMFuzzerTestOneInput(const std::uint8_t* data, std::size_t size) {
  using namespace stillzone;
  static const core::UnitReader units;
  core::FaultList faults;
  const auto document = core::JsonDocument::parse(fuzz::text_of(data, size), "model.json",
                                                  "a-folder-that-is-not-there", faults);
  if (!document) return 0;
  const auto model = kinetics::read_model(*document, units, faults);
  fuzz::promise(model.has_value() == faults.empty(), "a model or faults");
  if (model) fuzz::promise(!model->components.empty(), "a model has components");
  return 0;
}
