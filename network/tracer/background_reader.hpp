#pragma once

#include "core/json_reader.hpp"
#include "network/tracer/tracer_test.hpp"

namespace stillzone::network {

/// "background" of a test: a concentration, "before dose", or a straight line in time {"at_dose",
/// "later", "after"} that goes on beyond "after".
void read_background(core::ObjectReader& reader, TracerTest& test);

/// "background": "before dose": the mean of the samples before the dose, those under the limit at
/// half of it (common practice, no source). A drift seen in them is told but not followed: a few
/// days before the dose say nothing about the weeks after it. Call once the samples are read.
void background_from_samples(core::ObjectReader& reader, TracerTest& test);

}  // namespace stillzone::network
