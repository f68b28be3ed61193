#include <utility>

#include "network/tracer/tracer_model.hpp"

namespace stillzone::network {
namespace {

/// One of the candidates under the test's dose.
class CandidateUnderDose final : public TracerModel {
 public:
  CandidateUnderDose(std::unique_ptr<const RtdModel> model, const DoseInTurnovers& dose)
      : model_(std::move(model)), dose_(dose) {}

  [[nodiscard]] std::string name() const override { return std::string(model_->name()); }
  [[nodiscard]] std::string meaning() const override { return std::string(model_->meaning()); }
  [[nodiscard]] std::string source() const override { return std::string(model_->source()); }
  [[nodiscard]] std::span<const RtdParameter> parameters() const override {
    return model_->parameters();
  }
  [[nodiscard]] bool sees(const SamplingPoint& point) const override {
    return point.at == "outlet";
  }
  [[nodiscard]] bool predict(std::span<const double> p, std::span<const SamplePosition> positions,
                             std::span<double> values, std::span<double> gradient) const override {
    const std::size_t n = gradient.empty() ? 0 : p.size();
    for (std::size_t i = 0; i < positions.size(); ++i) {
      values[i] = response_to_dose(*model_, p, dose_, positions[i].theta,
                                   gradient.subspan(gradient.empty() ? 0 : i * n, n));
    }
    return true;
  }
  [[nodiscard]] const RtdModel& residence() const override { return *model_; }

 private:
  std::unique_ptr<const RtdModel> model_;
  DoseInTurnovers dose_;
};

}  // namespace

std::unique_ptr<const TracerModel> make_candidate(std::string_view name, const TracerTest& test) {
  auto model = make_rtd_model(name, test.volume, test.mean_flow);
  if (!model) return nullptr;
  return std::make_unique<CandidateUnderDose>(std::move(model), dose_in_turnovers(test));
}

}  // namespace stillzone::network
