#include "network/tracer/tracer_moments.hpp"

#include <gmock/gmock.h>
#include <gtest/gtest.h>

#include <cmath>
#include <functional>
#include <random>

#include "tests/unit/network/tracer_reading_support.hpp"

namespace stillzone::network {
namespace {

using testing::AnyOf;
using testing::Contains;
using testing::Each;
using testing::HasSubstr;
using testing::Not;

constexpr auto kLines = IntegrationRule::straight_lines;
constexpr double kHrt = 20.0;  // [d] of all tests below: 3000 m3 at 150 m3/d
constexpr double kC0 = 8.0;    // [g/m3]: 24 kg in 3000 m3

using Response = std::function<double(double)>;

/// A pulse test of 24 kg; times [d] and the response [g/m3] at them.
TracerTest pulse_test() {
  TracerTest test;
  test.tracer = "lithium";
  test.volume = core::Volume(3000.0);
  test.mean_flow = core::FlowRate(150.0);
  test.dose = PulseDose{24000.0, 0.0};
  return test;
}
SamplingPoint sampled(const std::vector<double>& times, const Response& response, double error) {
  SamplingPoint point;
  point.at = "outlet";
  point.csv = "outlet.csv";
  for (const double t : times) {
    point.samples.push_back({.time = t, .value = response(t), .error = error});
  }
  return point;
}
std::vector<double> every(double step, double until, double from = 0.0) {
  std::vector<double> times;
  for (int i = 0; from + i * step <= until + 1e-9; ++i) times.push_back(from + i * step);
  return times;
}
void add_noise(SamplingPoint& point, unsigned seed) {
  std::mt19937 random(seed);
  std::normal_distribution<double> normal;
  for (TracerSample& sample : point.samples) sample.value += sample.error * normal(random);
}
double tank(double t) { return kC0 * std::exp(-t / kHrt); }

TracerMoments moments_of(const TracerTest& test, const SamplingPoint& point,
                         IntegrationRule rule = kLines) {
  auto result = tracer_moments(test, point, rule);
  EXPECT_TRUE(result.ok()) << (result.ok() ? "" : result.failure().text());
  return std::move(result).value();
}

// ---- Textbook pulses through a test file -----------------------------------------------------

/// Levenspiel (1999), Chemical Reaction Engineering, 3rd ed., Ex. 11.1 (numbers from memory of the
/// book, recomputed): t [min], C [g/L]; area 100 g min/L. 1 L/min and 15 L, so that 100 g were
/// dosed and V/Q is the mean of 15 min.
TracerReading levenspiel() {
  return read_outlet("t,c\n0,0\n5,3\n10,5\n15,5\n20,4\n25,2\n30,1\n35,0\n",
                     R"({"volume": "15 L", "flow": "1 L/min", "dose": {"mass": "100 g"}})",
                     R"({"time": {"unit": "min"}, "value": {"unit": "g/L"}, "error": "0.01 g/L"})");
}
/// Fogler, Elements of Chemical Reaction Engineering, 4th ed., Ex. 13-1 (numbers from memory of the
/// book, recomputed): t [min], C [g/m3].
TracerReading fogler() {
  return read_outlet(
      "t,c\n0,0\n1,1\n2,5\n3,8\n4,10\n5,8\n6,6\n7,4\n8,3\n9,2.2\n10,1.5\n12,0.6\n14,0\n",
      R"({"volume": "5.1552 m3", "flow": "1 m3/min", "dose": {"mass": "50.0333 g"}})",
      R"({"time": {"unit": "min"}, "error": "0.05 g/m3"})");
}
constexpr double kMinute = 1.0 / 1440.0;

TEST(TracerMoments, LevenspielByTheNamedRules) {  // RTD-1
  const auto reading = levenspiel();
  ASSERT_TRUE(reading.test) << reading.faults;
  for (const auto rule : {IntegrationRule::equal_step_sum, IntegrationRule::trapezoid, kLines}) {
    const TracerMoments m = moments_of(*reading.test, reading.test->points[0], rule);
    EXPECT_NEAR(m.mean / kMinute, 15.0, 1e-9) << rule_name(rule);
    EXPECT_NEAR(m.recovery, 1.0, 1e-9);
    EXPECT_NEAR(m.active_fraction, 1.0, 1e-9);
    EXPECT_NEAR(m.variance / kMinute / kMinute, rule == kLines ? 51.0 + 2.0 / 3.0 : 47.5, 1e-8);
    EXPECT_DOUBLE_EQ(m.tail.share, 0.0);
  }
}

TEST(TracerMoments, FoglerBySimpson) {  // RTD-4: 50.033, 5.1552 min, 6.1085 min2
  const auto reading = fogler();
  ASSERT_TRUE(reading.test) << reading.faults;
  const TracerMoments m =
      moments_of(*reading.test, reading.test->points[0], IntegrationRule::simpson);
  EXPECT_NEAR(m.area / kMinute, 50.03333, 1e-4);
  EXPECT_NEAR(m.mean / kMinute, 5.15523, 1e-5);
  EXPECT_NEAR(m.variance / kMinute / kMinute, 6.10848, 1e-5);
  EXPECT_NEAR(m.recovery, 1.0, 1e-5);
}

// ---- The tail ----------------------------------------------------------------------------------

TEST(TracerMoments, TheFittedTailBringsBackATankCutAtOneAndAHalfTurnovers) {
  const TracerMoments m = moments_of(pulse_test(), sampled(every(0.25, 30.0), tank, 0.05));
  EXPECT_NEAR(m.recovery, 1.0, 0.01);
  EXPECT_NEAR(m.mean, kHrt, 0.01 * kHrt);
  EXPECT_NEAR(m.variance, kHrt * kHrt, 0.01 * kHrt * kHrt);
  EXPECT_NEAR(m.t10, -kHrt * std::log(0.9), 0.01 * kHrt);
  EXPECT_NEAR(m.t50, kHrt * std::log(2.0), 0.01 * kHrt);
  EXPECT_NEAR(m.t90, kHrt * std::log(10.0), 0.01 * kHrt * std::log(10.0));
  EXPECT_NEAR(m.morrill, std::log(0.1) / std::log(0.9), 0.25);
  EXPECT_NEAR(m.tail.share, std::exp(-1.5), 0.01);
  EXPECT_NEAR(m.tail.rate, 1.0 / kHrt, 1e-6);
  EXPECT_THAT(m.verdict, Contains(HasSubstr("22 % of the tracer is extrapolated")));
}

TEST(TracerMoments, ANoisyTailIsNotPulledUpByWhatSurvivesTheNoise) {
  // Fifty tests, sampled well into the noise: the mean over them shows a bias if there is one.
  double mean = 0.0;
  double recovery = 0.0;
  constexpr unsigned kTests = 50;
  for (unsigned seed = 1; seed <= kTests; ++seed) {
    SamplingPoint point = sampled(every(2.0, 80.0), tank, 0.2);
    add_noise(point, seed);
    const TracerMoments m = moments_of(pulse_test(), point);
    mean += m.mean / kTests;
    recovery += m.recovery / kTests;
  }
  EXPECT_NEAR(mean, kHrt, 0.02 * kHrt);
  EXPECT_NEAR(recovery, 1.0, 0.01);
}

TEST(TracerMoments, StatedErrorsCoverTheTruthAsOftenAsTheyShould) {
  // 25 samples to three turnovers, closer at first; 3 % and 0.02 g/m3.
  int n_mean = 0;
  int n_recovery = 0;
  int n_t90 = 0;
  constexpr int kTests = 200;
  for (unsigned seed = 1; seed <= kTests; ++seed) {
    SamplingPoint point;
    for (int i = 0; i <= 24; ++i) {
      const double t = 60.0 * std::pow(i / 24.0, 1.5);
      point.samples.push_back(
          {.time = t, .value = tank(t), .error = std::hypot(0.02, 0.03 * tank(t))});
    }
    add_noise(point, seed);
    const TracerMoments m = moments_of(pulse_test(), point);
    n_mean += std::abs(m.mean - kHrt) < 1.96 * m.errors.mean ? 1 : 0;
    n_recovery += std::abs(m.recovery - 1.0) < 1.96 * m.errors.recovery ? 1 : 0;
    n_t90 += std::abs(m.t90 - kHrt * std::log(10.0)) < 1.96 * m.errors.t90 ? 1 : 0;
  }
  // 95 % of 200 are 190, give or take 3; three times that.
  for (const int n : {n_mean, n_recovery, n_t90}) {
    EXPECT_GE(n, 181);
    EXPECT_LE(n, 199);
  }
}

TEST(TracerMoments, ACurveThatEndsBeforeItsExponentialGetsNoTail) {
  const auto box = [](double t) { return t < 10.0 ? 4.0 : t < 20.0 ? 8.0 - 0.4 * t : 0.0; };
  const TracerMoments m = moments_of(pulse_test(), sampled(every(2.0, 24.0), box, 0.05));
  EXPECT_DOUBLE_EQ(m.tail.share, 0.0);
  EXPECT_THAT(m.tail.note, HasSubstr("none: "));
}

TEST(TracerMoments, SamplesUnderTheLimitAtTheEndLieOnTheTail) {
  // Limit at 0.5 g/m3, passed at 55 d; twenty samples more say no more than "below".
  SamplingPoint cut = sampled(every(1.0, 120.0), tank, 0.02);
  for (TracerSample& sample : cut.samples) {
    sample.censored = sample.value < 0.5;
    sample.value = std::max(sample.value, 0.5);
  }
  const TracerMoments m = moments_of(pulse_test(), cut);
  EXPECT_NEAR(m.recovery, 1.0, 0.005);
  EXPECT_NEAR(m.mean, kHrt, 0.01 * kHrt);
  EXPECT_NEAR(m.variance, kHrt * kHrt, 0.02 * kHrt * kHrt);
  // Half the limit for 65 d would have added 16 g d/m3 to 160.
  EXPECT_THAT(m.verdict, Contains(HasSubstr("the mean lies between")));
  EXPECT_THAT(m.verdict, Contains(HasSubstr("lie under the detection limit")));
}

TEST(TracerMoments, SamplesUnderTheLimitBeforeTheTracerCountAsNothing) {
  const auto delayed = [](double t) {
    return t < 10.0 ? 0.0 : 2.0 * kC0 * std::exp(-(t - 10.0) / 10.0);
  };
  SamplingPoint point = sampled(every(0.5, 70.0), delayed, 0.02);
  for (TracerSample& sample : point.samples) {
    sample.censored = sample.value < 0.3;
    sample.value = std::max(sample.value, 0.3);
  }
  const TracerMoments m = moments_of(pulse_test(), point);
  EXPECT_NEAR(m.recovery, 1.025, 0.002);  // 16 g/m3 x 0.25 d of 160: a jump between two samples
  EXPECT_NEAR(m.mean, 20.0, 0.3);
  EXPECT_GT(m.t10, 9.5);
}

// ---- Before the first sample
// ---------------------------------------------------------------------

TEST(TracerMoments, ARisingCurveIsTakenBackToNothingAtTheDose) {
  // Two tanks of 10 d each; first sample at 4 d.
  const auto two_tanks = [](double t) { return 32.0 * t / 20.0 * std::exp(-t / 10.0); };
  const TracerMoments m =
      moments_of(pulse_test(), sampled(every(2.0, 100.0, 4.0), two_tanks, 0.02));
  EXPECT_NEAR(m.recovery, 1.0, 0.02);
  EXPECT_NEAR(m.mean, 20.0, 0.25);
  EXPECT_NEAR(m.variance, 200.0, 4.0);
}

TEST(TracerMoments, AFallingCurveIsTakenAsLevelBeforeItsFirstSample) {
  const TracerMoments m = moments_of(pulse_test(), sampled(every(1.0, 100.0, 1.0), tank, 0.02));
  EXPECT_NEAR(m.before_first_sample, std::exp(-1.0 / kHrt) / kHrt, 1e-3);
  EXPECT_NEAR(m.mean, kHrt, 0.05);
}

TEST(TracerMoments, ALateFirstSampleIsTold) {
  const TracerMoments m = moments_of(pulse_test(), sampled(every(2.0, 100.0, 6.0), tank, 0.02));
  EXPECT_THAT(m.verdict, Contains(HasSubstr("at an age of 6.0 d, 30 % of V/Q")));
  EXPECT_THAT(m.verdict, Contains(HasSubstr("t10 lies before the first sample")));
}

TEST(TracerMoments, MorrillIsLeftOutWhenTenPercentPassAtOnce) {
  // 17.8 of 162 g d/m3 within 86 s.
  const auto spike = [](double t) { return t < 1e-3 ? 3.56e7 * (1e-3 - t) : 0.9 * tank(t); };
  std::vector<double> times = every(1.0, 100.0, 1.0);
  times.insert(times.begin(), {0.0, 5e-4, 1e-3});
  const SamplingPoint point = sampled(times, spike, 0.02);
  const TracerMoments m = moments_of(pulse_test(), point);
  EXPECT_DOUBLE_EQ(m.morrill, 0.0);
  EXPECT_THAT(m.verdict, Contains(HasSubstr("(Morrill) has no meaning")));
}

// ---- Doses that take time, steps, records
// --------------------------------------------------------

TEST(TracerMoments, ATimedDoseIsTakenOffMeanAndVariance) {
  TracerTest test = pulse_test();
  const double kLength = 5.0;
  test.dose = PulseDose{24000.0, kLength};
  const auto response = [kLength](double t) {  // of a tank fed for 5 d, exact
    const double during = kC0 * kHrt / kLength * (1.0 - std::exp(-std::min(t, kLength) / kHrt));
    return t < kLength ? during : during * std::exp(-(t - kLength) / kHrt);
  };
  const TracerMoments m = moments_of(test, sampled(every(0.25, 160.0), response, 0.01));
  EXPECT_NEAR(m.recovery, 1.0, 1e-3);
  EXPECT_NEAR(m.mean, kHrt, 0.02);
  EXPECT_NEAR(m.variance, kHrt * kHrt, 2.0);
  EXPECT_NEAR(m.t50, kHrt * std::log(2.0), 0.1);
  EXPECT_NEAR(m.t90, kHrt * std::log(10.0), 0.1);
  EXPECT_THAT(m.verdict, Contains(HasSubstr("The dose took 5 d, 25 % of the mean")));
}

TracerTest step_test() {
  TracerTest test = pulse_test();
  test.dose = StepDose{3.0};
  return test;
}

TEST(TracerMoments, AStepTestOfATank) {
  const auto step = [](double t) { return 3.0 * (1.0 - std::exp(-t / kHrt)); };
  const TracerMoments m = moments_of(step_test(), sampled(every(1.0, 50.0), step, 0.01));
  EXPECT_NEAR(m.recovery, 1.0, 1e-3);
  EXPECT_NEAR(m.mean, kHrt, 0.02);
  EXPECT_NEAR(m.variance, kHrt * kHrt, 1.0);
  EXPECT_NEAR(m.t10, -kHrt * std::log(0.9), 0.02);
  EXPECT_NEAR(m.t90, kHrt * std::log(10.0), 0.1);
  EXPECT_NEAR(m.tail.share, std::exp(-2.5), 2e-3);
}

TEST(TracerMoments, ANoisyStepTestHasARisingCurveAndTheRightMoments) {
  const auto step = [](double t) { return 2.4 * (1.0 - std::exp(-t / kHrt)); };
  double recovery = 0.0;
  double mean = 0.0;
  double variance = 0.0;
  constexpr unsigned kTests = 50;
  for (unsigned seed = 1; seed <= kTests; ++seed) {
    SamplingPoint point = sampled(every(1.0, 80.0), step, 0.1);
    add_noise(point, seed);
    const TracerMoments m = moments_of(step_test(), point);
    for (const double density : m.curve.density()) EXPECT_GE(density, 0.0);
    recovery += m.recovery / kTests;
    mean += m.mean / kTests;
    variance += m.variance / kTests;
  }
  EXPECT_NEAR(recovery, 0.8, 0.01);
  // Single tests scatter by 1.2 d and 100 d2: three standard errors of the mean of fifty.
  EXPECT_NEAR(mean, kHrt, 0.5);
  EXPECT_NEAR(variance, kHrt * kHrt, 42.0);
}

TEST(TracerMoments, AStepTestCutShortSaysSo) {
  const auto step = [](double t) { return 3.0 * (1.0 - std::exp(-t / kHrt)); };
  SamplingPoint point = sampled(every(1.0, 8.0), step, 0.05);
  const TracerMoments m = moments_of(step_test(), point);
  EXPECT_THAT(m.verdict, Contains(HasSubstr("still rise and do not tell where to")));
  TracerTest as_dosed = step_test();
  as_dosed.recovery_fitted = false;
  const TracerMoments known = moments_of(as_dosed, sampled(every(1.0, 30.0), step, 0.01));
  EXPECT_NEAR(known.mean, kHrt, 0.1);
}

TEST(TracerMoments, AVariableFlowCountedInTurnoversGivesTheSteadyResult) {
  // 50 m3/d to day 10, none to day 14, 300 m3/d to day 30, then 150 m3/d; a tank follows its
  // turnovers alone.
  TracerTest test = pulse_test();
  test.flow_record = core::Timeline::steps({0.0, 10.0, 14.0, 30.0}, {50.0, 0.0, 300.0, 150.0});
  const std::vector<double> times = every(0.25, 120.0);
  test.mean_flow = core::FlowRate(test.flow_record->mean(0.0, 120.0));
  const double hrt = 3000.0 / test.mean_flow.value();
  const auto response = [&](double t) { return kC0 * std::exp(-test.turnovers(t)); };
  const TracerMoments m = moments_of(test, sampled(times, response, 0.01));
  EXPECT_NEAR(m.hydraulic_retention_time, hrt, 1e-12);
  EXPECT_NEAR(m.recovery, 1.0, 2e-3);
  EXPECT_NEAR(m.mean, hrt, 2e-3 * hrt);
  EXPECT_NEAR(m.variance, hrt * hrt, 1e-2 * hrt * hrt);
  EXPECT_NEAR(m.t90, hrt * std::log(10.0), 0.01 * hrt);
}

TEST(TracerMoments, ADriftingBackgroundIsTakenOff) {
  TracerTest test = pulse_test();
  test.background = {.level = 0.5, .slope = 0.01, .how = "drifting"};
  const auto response = [](double t) { return tank(t) + 0.5 + 0.01 * t; };
  const TracerMoments m = moments_of(test, sampled(every(0.5, 100.0), response, 0.01));
  EXPECT_NEAR(m.recovery, 1.0, 2e-3);
  EXPECT_NEAR(m.mean, kHrt, 0.02);
}

// ---- Verdicts
// --------------------------------------------------------------------------------------

TracerMoments with_recovery(double recovery, const char* tracer = "lithium") {
  TracerTest test = pulse_test();
  test.tracer = tracer;
  return moments_of(
      test, sampled(
                every(1.0, 100.0), [&](double t) { return recovery * tank(t); }, 0.001 * recovery));
}

TEST(TracerVerdict, RecoveryOutOf85To115PercentComesFirst) {
  EXPECT_THAT(with_recovery(0.6).verdict.front(), HasSubstr("Recovery 60 % is low"));
  EXPECT_THAT(with_recovery(1.4).verdict.front(),
              HasSubstr("Recovery 140 % is more than was dosed"));
  EXPECT_THAT(with_recovery(1.0).verdict.back(), HasSubstr("lies within 85 to 115 %"));
}

TEST(TracerVerdict, ADoseOfSaltTakenAsMetalIsRecognised) {
  // Lithium chloride holds 6.94/42.39 = 16.4 % lithium.
  EXPECT_THAT(with_recovery(0.164).verdict.front(),
              HasSubstr("16.4 % of lithium in lithium chloride LiCl"));
  EXPECT_THAT(with_recovery(0.19).verdict.front(), HasSubstr("lithium carbonate"));
  EXPECT_THAT(with_recovery(6.1).verdict.front(), HasSubstr("weighs over its lithium (6.11)"));
  EXPECT_THAT(with_recovery(0.164, "fluoride").verdict.front(), Not(HasSubstr("lithium")));
}

TEST(TracerVerdict, AFactorOfAThousandPointsToUnits) {
  EXPECT_THAT(with_recovery(1000.0).verdict.front(), HasSubstr("check the units"));
  EXPECT_THAT(with_recovery(0.001).verdict.front(), HasSubstr("check the units"));
}

TEST(TracerVerdict, AMeanLongerThanRetentionCannotBe) {
  TracerTest test = pulse_test();
  test.volume = core::Volume(2400.0);
  const TracerMoments m = moments_of(test, sampled(every(1.0, 120.0), tank, 0.01));
  EXPECT_NEAR(m.active_fraction, 1.25, 0.01);
  EXPECT_THAT(m.verdict, Contains(HasSubstr("1.25 times V/Q, which no steady flow can give")));
}

TEST(TracerVerdict, ADeadVolumeShowsInTheMean) {
  const auto dead = [](double t) { return kC0 / 0.7 * std::exp(-t / (0.7 * kHrt)); };
  const TracerMoments m = moments_of(pulse_test(), sampled(every(0.5, 120.0), dead, 0.01));
  EXPECT_NEAR(m.active_fraction, 0.7, 0.005);
  EXPECT_THAT(m.verdict, Contains(HasSubstr("mean residence time is 70 % of V/Q")));
}

TEST(TracerVerdict, FewSamplesAreTold) {
  const TracerMoments m = moments_of(pulse_test(), sampled(every(15.0, 90.0), tank, 0.01));
  EXPECT_THAT(m.verdict, Contains(HasSubstr("Only 7 samples")));
}

TEST(TracerVerdict, ABackgroundSetTooHighIsTold) {
  TracerTest test = pulse_test();
  test.background.level = 0.2;
  const TracerMoments m = moments_of(test, sampled(every(2.0, 140.0), tank, 0.05));
  EXPECT_THAT(m.verdict, Contains(HasSubstr("below the background: it is set too high")));
}

TEST(TracerVerdict, TwoHumpsAreTwoPathsNotNoise) {
  const auto humps = [](double t) {
    return 6.0 * std::exp(-std::pow((t - 6.0) / 2.0, 2)) +
           4.0 * std::exp(-std::pow((t - 25.0) / 6.0, 2));
  };
  SamplingPoint point = sampled(every(1.0, 60.0), humps, 0.15);
  add_noise(point, 3);
  const TracerMoments m = moments_of(pulse_test(), point);
  EXPECT_THAT(m.verdict, Contains(HasSubstr("The curve rises again after its peak")));
  // Areas 6 x 2 sqrt(pi) and 4 x 6 sqrt(pi): mean (12 x 6 + 24 x 25)/36, by hand.
  EXPECT_NEAR(m.mean, 672.0 / 36.0, 0.5);
  SamplingPoint one = sampled(every(1.0, 60.0), tank, 0.15);
  add_noise(one, 3);
  EXPECT_THAT(moments_of(pulse_test(), one).verdict, Each(Not(HasSubstr("rises again"))));
}

TEST(TracerVerdict, ATracerThatDecaysIsTold) {
  TracerTest test = pulse_test();
  test.conservative = false;
  EXPECT_THAT(moments_of(test, sampled(every(1.0, 80.0), tank, 0.02)).verdict,
              Contains(HasSubstr("stated as not conservative")));
}

TEST(TracerVerdict, APeakOfOneSampleIsTold) {
  const auto spike = [](double t) { return t < 4.5 && t > 3.5 ? 20.0 : 2.0 * std::exp(-t / 10.0); };
  const TracerMoments m = moments_of(pulse_test(), sampled(every(2.0, 60.0), spike, 0.02));
  // 20 g/m3 x 2 d beside 2 g/m3 x 10 d of the rest.
  EXPECT_THAT(m.verdict, Contains(HasSubstr("% of the tracer hang on the one sample")));
  EXPECT_THAT(moments_of(pulse_test(), sampled(every(1.0, 60.0), tank, 0.02)).verdict,
              Each(Not(HasSubstr("hang on"))));
}

TEST(TracerVerdict, AnUnsteadyFlowIsTold) {
  TracerTest test = pulse_test();
  test.flow_record = core::Timeline::steps({0.0, 20.0}, {100.0, 200.0});
  test.mean_flow = core::FlowRate(test.flow_record->mean(0.0, 80.0));
  EXPECT_THAT(moments_of(test, sampled(every(1.0, 80.0), tank, 0.02)).verdict,
              Contains(HasSubstr("The flow went from 100 to 200 m3/d")));
}

TEST(TracerVerdict, ATestThatEndsAtItsPeakIsTold) {
  const TracerMoments m =
      moments_of(pulse_test(), sampled(
                                   every(1.0, 12.0), [](double t) { return 0.5 * t; }, 0.05));
  EXPECT_THAT(m.verdict, Contains(HasSubstr("The test ended at 100 % of the peak")));
}

// ---- What cannot be evaluated
// ------------------------------------------------------------------------

std::string failure(const TracerTest& test, const SamplingPoint& point,
                    IntegrationRule rule = kLines) {
  const auto result = tracer_moments(test, point, rule);
  return result.ok() ? std::string("no failure") : result.failure().text();
}

TEST(TracerMoments, TooLittleIsAFailureNotACrash) {
  EXPECT_THAT(failure(pulse_test(), sampled({1.0}, tank, 0.1)),
              HasSubstr("1 usable samples after the dose; at least 4 are needed"));
  EXPECT_THAT(failure(pulse_test(), sampled(
                                        every(1.0, 9.0), [](double) { return 0.05; }, 0.1)),
              HasSubstr("no sample rises above the background by more than two errors"));
  SamplingPoint censored = sampled(every(1.0, 9.0), tank, 0.1);
  for (TracerSample& sample : censored.samples) sample.censored = true;
  EXPECT_THAT(failure(pulse_test(), censored),
              HasSubstr("every sample lies under its detection limit"));
  const auto wild = [](double t) { return t < 1.5 ? 3.0 : -2.0; };
  EXPECT_THAT(failure(pulse_test(), sampled(every(1.0, 9.0), wild, 0.1)),
              HasSubstr("as much below the background as above it"));
  EXPECT_THAT(failure(pulse_test(), sampled({0.0, 1.0, 3.0, 4.0, 8.0}, tank, 0.1),
                      IntegrationRule::equal_step_sum),
              HasSubstr("equal steps from the dose on"));
}

TEST(TracerMoments, NumbersStayFiniteWhateverTheSamples) {
  std::mt19937 random(11);
  std::uniform_real_distribution<double> uniform(0.0, 1.0);
  int n_ok = 0;
  for (int k = 0; k < 400; ++k) {
    TracerTest test = uniform(random) < 0.3 ? step_test() : pulse_test();
    if (uniform(random) < 0.3) {
      test.flow_record = core::Timeline::steps({0.0, 5.0, 9.0}, {100.0, 0.0, 150.0});
    }
    SamplingPoint point;
    const int n = 1 + static_cast<int>(20.0 * uniform(random));
    double t = uniform(random) < 0.5 ? 0.0 : 3.0 * uniform(random);
    for (int i = 0; i < n; ++i) {
      point.samples.push_back({.time = t,
                               .value = 6.0 * uniform(random) - 1.0,
                               .error = 0.01 + uniform(random),
                               .censored = uniform(random) < 0.2});
      t += 1e-3 + 5.0 * uniform(random);
    }
    for (const auto rule : {kLines, IntegrationRule::trapezoid, IntegrationRule::simpson,
                            IntegrationRule::equal_step_sum}) {
      const auto result = tracer_moments(test, point, rule);
      if (!result.ok()) continue;
      ++n_ok;
      const TracerMoments& m = result.value();
      for (const double number :
           {m.recovery, m.area, m.mean, m.variance, m.active_fraction, m.t10, m.t50, m.t90,
            m.morrill, m.baffling, m.tail.share, m.tail.rate, m.before_first_sample}) {
        EXPECT_TRUE(std::isfinite(number)) << "round " << k << " " << rule_name(rule);
      }
      EXPECT_LE(m.t10, m.t50);
      EXPECT_LE(m.t50, m.t90);
      EXPECT_FALSE(m.verdict.empty());
    }
  }
  EXPECT_GT(n_ok, 400);
}

}  // namespace
}  // namespace stillzone::network
