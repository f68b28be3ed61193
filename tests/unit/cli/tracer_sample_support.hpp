#pragma once

#include <memory>
#include <string>

#include "cli/report/tracer_report.hpp"

namespace stillzone::cli {

/// An invented lithium test and its analysis, as the command would hand them to the report.
struct TracerSampleCase {
  std::string text;  ///< of the test document
  network::TracerTest test;
  network::TracerAnalysis analysis;
  std::vector<std::string> remarks;
  [[nodiscard]] TracerReportInput input() const {
    return {test, analysis, {"test", "invented_test.json", text, "none", "no date"}, remarks};
  }
};

/// 3000 m3, of which 35 % stand still and exchange 45 m3/d; flow that varies around 150 m3/d; 24 kg
/// of lithium; 92 % recovered; 40 samples with an error of 0.1 g/m3 and 2 %; the last ones under
/// the detection limit of 0.3 g/m3; 4 samples before the dose.
/// @param models the list of the document (JSON); empty: all, which takes long to fit
std::unique_ptr<TracerSampleCase> two_region_sample(const std::string& models);

/// Two sampling points, outlet and a zone, of a network of the user's own that bears the name of
/// one of our models; 1000 m3 at 50 m3/d.
std::unique_ptr<TracerSampleCase> own_network_sample();

/// Three samples: no model can be fitted, no moments.
std::unique_ptr<TracerSampleCase> too_few_samples();

/// A step in the feed of one mixed tank at constant flow.
std::unique_ptr<TracerSampleCase> step_sample();

}  // namespace stillzone::cli
