#pragma once

#include <string>

#include "cli/report/tracer_report.hpp"

namespace stillzone::cli {

// The sections of the report of `tracer`, each as HTML, in the order of the page.

/// How many models are drawn and named beside each other.
inline constexpr std::size_t kModelsShown = 3;

/// Three sentences: best model in plain words; recovery; residence times against an ideal tank.
/// Then the verdict on the data and on the fit.
[[nodiscard]] std::string tracer_answer_section(const TracerReportInput& input);
/// Samples and fits, linear and logarithmic, one pair of charts per sampling point.
[[nodiscard]] std::string tracer_curve_section(const TracerReportInput& input);
[[nodiscard]] std::string tracer_residual_section(const TracerReportInput& input);
[[nodiscard]] std::string tracer_ranking_section(const TracerReportInput& input);
[[nodiscard]] std::string tracer_parameter_section(const TracerReportInput& input);
[[nodiscard]] std::string tracer_network_section(const TracerReportInput& input);
/// Moments, quantiles and tail of the samples alone.
[[nodiscard]] std::string tracer_moments_section(const TracerReportInput& input);
/// Conversion and young shares.
[[nodiscard]] std::string tracer_mixing_section(const TracerReportInput& input);
[[nodiscard]] std::string tracer_open_section(const TracerReportInput& input);
[[nodiscard]] std::string tracer_inputs_section(const TracerReportInput& input);
[[nodiscard]] std::string tracer_assumptions_section(const TracerReportInput& input);
[[nodiscard]] std::string tracer_cautions_section(const TracerReportInput& input);

}  // namespace stillzone::cli
