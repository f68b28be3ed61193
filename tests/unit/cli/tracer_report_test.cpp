#include "cli/report/tracer_report.hpp"

#include <gmock/gmock.h>
#include <gtest/gtest.h>

#include <algorithm>
#include <memory>

#include "cli/report/tracer_words.hpp"
#include "tests/unit/cli/tracer_sample_support.hpp"

namespace stillzone::cli {
namespace {

using testing::HasSubstr;
using testing::Not;

/// With the models that are quick to fit.
std::unique_ptr<TracerSampleCase> two_regions() {
  return two_region_sample(R"(["one_tank", "bypass_dead", "stagnant_exchange", "parallel_paths"])");
}

/// Each page is made once.
const std::string& two_region_page() {
  static const std::string page = tracer_report_page(two_regions()->input());
  return page;
}
const std::string& step_page() {
  static const std::string page = tracer_report_page(step_sample()->input());
  return page;
}

std::string section(const std::string& page, const std::string& anchor) {
  const auto from = page.find("<section id=\"" + anchor + "\">");
  if (from == std::string::npos) return "";
  return page.substr(from, page.find("</section>", from) - from);
}

std::size_t count(const std::string& text, const std::string& what) {
  std::size_t n = 0;
  for (auto at = text.find(what); at != std::string::npos; at = text.find(what, at + 1)) ++n;
  return n;
}

network::FittedParameter held(const char* name, const char* unit, double low, double value,
                              double high) {
  network::FittedParameter p;
  p.name = name;
  p.unit = unit;
  p.low = low;
  p.value = value;
  p.high = high;
  return p;
}

network::TracerTest tank_of(double volume, double flow) {
  network::TracerTest test;
  test.volume = core::Volume(volume);
  test.mean_flow = core::FlowRate(flow);
  return test;
}

TEST(RangeInWords, ShowsAsManyDecimalsAsItsWidthNeeds) {
  EXPECT_EQ(range_in_words(31.24, 38.41, 35.0, "%"), "31 to 38\u00A0%");
  EXPECT_EQ(range_in_words(0.9921, 1.0174, 1.0, ""), "0.99 to 1.02");
  EXPECT_EQ(range_in_words(2310.4, 2529.8, 2400.0, "m3"), "2310 to 2530\u00A0m\u00B3");
}

TEST(RangeInWords, SaysWhichEndIsNotHeld) {
  EXPECT_EQ(range_in_words({}, 3.21, 0.0, "%"), "at most 3.21\u00A0%");
  EXPECT_EQ(range_in_words(3.21, {}, 9.0, "%"), "at least 3.21\u00A0%");
  EXPECT_EQ(range_in_words({}, {}, 9.0, "%"), "about 9\u00A0% (not held by this test)");
}

// 1 - 0.69 = 0.31 and 1 - 0.62 = 0.38 of 3000 m3: 930 and 1140 m3.
TEST(ModelInWords, TurnsTheMixedShareIntoWhatStandsStill) {
  network::ModelFit fit;
  fit.name = "stagnant_exchange";
  fit.parameters = {held("mixed_fraction", "1", 0.62, 0.65, 0.69),
                    held("exchange_flow", "m3/d", 41.0, 45.0, 54.0)};
  EXPECT_EQ(model_in_words(fit, tank_of(3000.0, 150.0)),
            "<b>31 to 38\u00A0%</b> of the nominal volume (930 to 1140\u00A0m\u00B3) stands still, "
            "exchanging <b>41 to 54\u00A0m\u00B3/d</b> with the mixed rest (27 to 36\u00A0% of the "
            "flow)");
}

TEST(ModelInWords, SaysWhenAFitNeedsMoreThanTheTankHolds) {
  network::ModelFit fit;
  fit.name = "one_tank";
  fit.parameters = {held("volume", "m3", 3300.0, 3400.0, 3500.0)};
  EXPECT_THAT(model_in_words(fit, tank_of(3000.0, 150.0)), HasSubstr("more than the tank holds"));
}

TEST(ModelInWords, NamesTheQuantitiesOfAnyOtherNetwork) {
  network::ModelFit fit;
  fit.name = "our <network>";
  fit.parameters = {held("zone <a>", "m3", 300.0, 340.0, 390.0),
                    held("recovered_fraction", "1", 0.9, 0.95, 1.0)};
  EXPECT_EQ(model_in_words(fit, tank_of(3000.0, 150.0)),
            "zone &lt;a&gt; <b>300 to 390\u00A0m\u00B3</b>");
}

TEST(TracerReport, AnswersInThreeSentencesWithTheModelThatMadeTheData) {
  const std::string answer = section(two_region_page(), "answer");
  const std::string box = answer.substr(0, answer.find("</div>"));
  EXPECT_EQ(count(box, "<p>"), 3U);
  EXPECT_THAT(box, HasSubstr("<b>stagnant_exchange</b> explains the samples best"));
  EXPECT_THAT(box, HasSubstr("stands still, exchanging"));
  EXPECT_THAT(box, HasSubstr("of the tracer dosed was found at the outlet"));
  EXPECT_THAT(box, HasSubstr("part of the feed leaves too early"));
}

TEST(TracerReport, HasEverySectionInOrder) {
  std::size_t last = 0;
  for (const char* anchor :
       {"answer", "curve", "residuals", "ranking", "parameters", "networks", "moments", "mixing",
        "open", "inputs", "assumed", "cautions", "provenance"}) {
    const auto at = two_region_page().find(std::string("<section id=\"") + anchor + "\">");
    ASSERT_NE(at, std::string::npos) << anchor;
    EXPECT_GT(at, last) << anchor;
    last = at;
  }
}

TEST(TracerReport, ShowsCensoredSamplesAsSuch) {
  const auto sample = two_regions();
  const auto& samples = sample->test.points.front().samples;
  const auto n = std::ranges::count_if(samples, &network::TracerSample::censored);
  ASSERT_GT(n, 0);
  const std::string curve = section(two_region_page(), "curve");
  EXPECT_THAT(curve, HasSubstr(std::to_string(n) + " of " + std::to_string(samples.size()) +
                               " samples lie under the detection limit"));
  EXPECT_THAT(curve, HasSubstr("data-name=\"under detection limit\""));
}

TEST(TracerReport, DrawsLinearAndLogarithmicWithNumbersAsCsv) {
  const std::string curve = section(two_region_page(), "curve");
  EXPECT_EQ(count(curve, "Numbers as CSV"), 2U);
  EXPECT_THAT(curve, HasSubstr("download=\"curve-outlet.csv\""));
  EXPECT_THAT(curve, HasSubstr("download=\"curve-log-outlet.csv\""));
  EXPECT_EQ(count(curve, "data-name=\"stagnant_exchange\""), 2U);
}

TEST(TracerReport, RanksEveryModelThatWasFitted) {
  const auto sample = two_regions();
  const std::string ranking = section(two_region_page(), "ranking");
  for (const auto& ranked : sample->analysis.models) {
    EXPECT_THAT(ranking, HasSubstr("<th scope=row>" + ranked.fit.name + "</th>"));
  }
}

TEST(TracerReport, DrawsTheStagnantZoneHatched) {
  const std::string networks = section(two_region_page(), "networks");
  EXPECT_THAT(networks, HasSubstr("id=\"fig-network-stagnant_exchange\""));
  EXPECT_THAT(networks, HasSubstr("Zone still:"));
  EXPECT_THAT(networks, HasSubstr("core exchanges with still"));
}

TEST(TracerReport, NamesTheIntegrationRule) {
  EXPECT_THAT(section(two_region_page(), "moments"),
              HasSubstr("Integration rule: <b>straight lines</b>"));
}

TEST(TracerReport, EscapesWhatTheUserWrote) {
  EXPECT_THAT(two_region_page(), Not(HasSubstr("<regions>")));
  EXPECT_THAT(two_region_page(), Not(HasSubstr("with <tags>")));
  EXPECT_THAT(section(two_region_page(), "open"), HasSubstr("with &lt;tags&gt; &amp; signs."));
}

TEST(TracerReport, WarnsOfLithiumOnlyWhereItIsUsed) {
  EXPECT_THAT(section(two_region_page(), "cautions"), HasSubstr("harmful if swallowed"));
  EXPECT_THAT(section(step_page(), "cautions"), Not(HasSubstr("ithium")));
  EXPECT_THAT(section(step_page(), "cautions"), HasSubstr("safety data sheet"));
}

TEST(TracerReport, DrawsWhatIsMissingOfAStep) {
  EXPECT_THAT(section(step_page(), "curve"), HasSubstr("What is still missing of the step"));
}

// The volume's interval holds the nominal 800 m3: no dead volume is to be drawn.
TEST(TracerReport, DrawsNoDeadVolumeThatTheTestDoesNotTellFromNone) {
  EXPECT_THAT(section(step_page(), "networks"), Not(HasSubstr("Zone dead")));
}

TEST(TracerReport, ShowsANetworkOfTheUsersOwnWithItsPoints) {
  const auto sample = own_network_sample();
  ASSERT_NE(sample, nullptr);
  ASSERT_FALSE(sample->analysis.models.empty());
  const std::string page = tracer_report_page(sample->input());
  EXPECT_THAT(section(page, "networks"), HasSubstr("is a network of your own"));
  EXPECT_THAT(section(page, "answer"), HasSubstr("/zones/pocket/volume"));
  EXPECT_THAT(section(page, "answer"), HasSubstr("go by the fits there"));
  EXPECT_THAT(section(page, "curve"), HasSubstr("download=\"curve-pocket-2.csv\""));
  EXPECT_THAT(section(page, "residuals"), HasSubstr("download=\"residuals-pocket-2.csv\""));
}

TEST(TracerReport, SaysWhenNothingCouldBeFitted) {
  const auto sample = too_few_samples();
  ASSERT_TRUE(sample->analysis.models.empty());
  const std::string page = tracer_report_page(sample->input());
  EXPECT_THAT(section(page, "answer"), HasSubstr("No zone model could be fitted"));
  EXPECT_THAT(section(page, "answer"), HasSubstr("No moments:"));
  EXPECT_THAT(section(page, "ranking"), HasSubstr("Models that could not be fitted"));
  EXPECT_EQ(section(page, "networks"), "");
}

TEST(TracerReport, SaysInTheAnswerWhenResidualsSpeakAgainstTheBestModel) {
  const auto sample = two_region_sample(R"(["one_tank"])");
  ASSERT_EQ(sample->analysis.models.size(), 1U);
  EXPECT_THAT(section(tracer_report_page(sample->input()), "answer"),
              HasSubstr("yet its residuals speak against it"));
  EXPECT_THAT(section(two_region_page(), "answer"), Not(HasSubstr("speak against it")));
}

// A tenth of a mixed tank leaves in 0.105 V/Q; the first sample is taken at 0.2 V/Q.
TEST(TracerReport, TakesTheFirstTenthFromTheModelWhereSamplesBeginLate) {
  EXPECT_THAT(section(step_page(), "answer"),
              HasSubstr("by the best model (before the first sample)"));
}

// Half of the dose as a bypass within half an hour stands hundreds of times above the samples.
TEST(TracerReport, ScalesTheChartByTheSamplesNotByTheBypass) {
  const auto sample = two_region_sample(R"(["bypass_dead"])");
  EXPECT_THAT(section(tracer_report_page(sample->input()), "curve"),
              HasSubstr("a fitted curve runs off the top"));
  EXPECT_THAT(section(two_region_page(), "curve"), Not(HasSubstr("runs off the top")));
}

TEST(TracerReport, DrawsEverySamplingPointUnderANameOfItsOwn) {
  auto sample = two_regions();
  sample->test.points.push_back(sample->test.points.front());
  sample->test.points.back().at = "pipe <2>";
  sample->analysis.points.push_back({"pipe <2>", std::nullopt, "invented reason"});
  const std::string page = tracer_report_page(sample->input());
  EXPECT_THAT(section(page, "curve"), HasSubstr("download=\"curve-pipe--2--2.csv\""));
  EXPECT_THAT(section(page, "moments"), HasSubstr("invented reason"));
  EXPECT_THAT(page, Not(HasSubstr("<2>")));
}

TEST(TracerReport, SaysWhenT10IsNotKnown) {
  auto sample = step_sample();
  sample->analysis.points.front().moments->morrill = 0.0;
  EXPECT_THAT(section(tracer_report_page(sample->input()), "moments"), HasSubstr("not known"));
}

}  // namespace
}  // namespace stillzone::cli
