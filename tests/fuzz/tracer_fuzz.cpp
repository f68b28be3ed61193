// Tracer test: a document beside a table that stands still, or a table of samples under a document
// that does; then the moments by every rule.
#include <unistd.h>

#include <cmath>
#include <filesystem>
#include <fstream>
#include <string>

#include "network/tracer/tracer_moments.hpp"
#include "network/tracer/tracer_test.hpp"
#include "tests/fuzz/fuzz_support.hpp"

namespace {

using namespace stillzone;

constexpr const char* kTest = R"({
  "stillzone": "test/1", "volume": "3000 m3", "flow": "150 m3/d",
  "dose": { "tracer": "lithium", "mass": "24 kg", "at": "0 d", "over": "1 h" },
  "background": "0.02 g/m3",
  "samples": [ { "at": "outlet", "csv": "outlet.csv", "time": { "column": "t_d", "unit": "d" },
    "value": { "column": "li", "unit": "g/m3" }, "error": ["3 %", "0.02 g/m3"],
    "detection_limit": "0.02 g/m3" } ] })";
constexpr const char* kTable =
    "t_d,li\n-1,0.02\n0,0.02\n1,7.6\n2,7.3\n5,6.2\n10,4.9\n20,3\n40,<1\n";

/// A folder of this process with one table in it.
class TableFolder {
 public:
  TableFolder()
      : folder_(std::filesystem::temp_directory_path() /
                ("stillzone_fuzz_" + std::to_string(::getpid()))) {
    std::filesystem::create_directories(folder_);
  }
  ~TableFolder() {
    std::error_code error;
    std::filesystem::remove_all(folder_, error);
  }
  TableFolder(const TableFolder&) = delete;
  TableFolder& operator=(const TableFolder&) = delete;
  TableFolder(TableFolder&&) = delete;
  TableFolder& operator=(TableFolder&&) = delete;

  void write(std::string_view table) const {
    std::ofstream(folder_ / "outlet.csv", std::ios::binary) << table;
  }
  [[nodiscard]] const std::filesystem::path& path() const { return folder_; }

 private:
  std::filesystem::path folder_;
};

void check_moments(const network::TracerTest& test) {
  using network::IntegrationRule;
  for (const auto rule : {IntegrationRule::straight_lines, IntegrationRule::trapezoid,
                          IntegrationRule::equal_step_sum, IntegrationRule::simpson}) {
    const auto result = network::tracer_moments(test, test.points.front(), rule);
    if (!result.ok()) continue;
    const network::TracerMoments& m = result.value();
    for (const double number : {m.recovery, m.area, m.mean, m.variance, m.t10, m.t50, m.t90,
                                m.morrill, m.baffling, m.tail.share, m.before_first_sample}) {
      fuzz::promise(std::isfinite(number), "moments are finite");
    }
    fuzz::promise(m.t10 <= m.t50 && m.t50 <= m.t90, "quantiles rise");
    fuzz::promise(!m.verdict.empty(), "there is a verdict");
  }
}

}  // namespace

int LLVMFuzzerTestOneInput(const std::uint8_t* data, std::size_t size) {
  static const core::UnitReader units;
  static const TableFolder folder;
  const std::string_view text = fuzz::text_of(data, size);
  const bool is_document = !text.empty() && (text.front() == '{' || text.front() == '[');
  folder.write(is_document ? kTable : text);
  core::FaultList faults;
  const auto document = core::JsonDocument::parse(is_document ? text : std::string_view(kTest),
                                                  "test.json", folder.path(), faults);
  fuzz::promise(document.has_value() == faults.empty(), "a document or faults");
  if (!document) return 0;
  const auto test = network::read_tracer_test(*document, units, faults);
  fuzz::promise(test.has_value() == faults.empty(), "a test or faults");
  for (const auto& fault : faults.all()) fuzz::promise(!fault.found.empty(), "a fault says what");
  if (!test) return 0;
  for (const auto& point : test->points) {
    fuzz::promise(!point.samples.empty(), "a point has samples");
    for (const auto& sample : point.samples) {
      fuzz::promise(std::isfinite(sample.time) && std::isfinite(sample.value), "finite samples");
      fuzz::promise(sample.error > 0.0, "every sample has an error");
      fuzz::promise(sample.time >= test->dose_at, "samples start at the dose");
    }
  }
  check_moments(*test);
  return 0;
}
