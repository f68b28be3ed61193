#include "network/tracer/dose_response.hpp"

#include <variant>
#include <vector>

namespace stillzone::network {
namespace {

void scale(std::span<double> gradient, double factor) {
  for (double& entry : gradient) entry *= factor;
}

}  // namespace

DoseInTurnovers dose_in_turnovers(const TracerTest& test) {
  if (const auto* pulse = std::get_if<PulseDose>(&test.dose)) {
    return {.kind = DoseInTurnovers::Kind::pulse,
            .strength = pulse->mass / test.volume.value(),
            .length = test.turnovers(test.dose_at + pulse->duration)};
  }
  return {.kind = DoseInTurnovers::Kind::step,
          .strength = std::get<StepDose>(test.dose).concentration,
          .length = 0.0};
}

double response_to_dose(const RtdModel& model, std::span<const double> p,
                        const DoseInTurnovers& dose, double theta, std::span<double> gradient) {
  if (theta < 0.0) {
    scale(gradient, 0.0);
    return 0.0;
  }
  if (dose.kind == DoseInTurnovers::Kind::step) {
    const double response = model.step_response(p, theta, gradient);
    scale(gradient, dose.strength);
    return dose.strength * response;
  }
  if (!(dose.length > 0.0)) {
    const double density = model.density(p, theta, gradient);
    scale(gradient, dose.strength);
    return dose.strength * density;
  }
  const double rate = dose.strength / dose.length;
  double response = model.step_response(p, theta, gradient);
  if (theta >= dose.length) {
    std::vector<double> earlier(gradient.size());
    response -= model.step_response(p, theta - dose.length, earlier);
    for (std::size_t j = 0; j < gradient.size(); ++j) gradient[j] -= earlier[j];
  }
  scale(gradient, rate);
  return rate * response;
}

}  // namespace stillzone::network
