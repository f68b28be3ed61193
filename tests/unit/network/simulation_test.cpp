#include "network/simulation.hpp"

#include <gtest/gtest.h>

#include <algorithm>
#include <cmath>
#include <filesystem>
#include <string>

#include "core/dae/integrator.hpp"
#include "core/dae/linear_solver.hpp"
#include "network/digester_system.hpp"
#include "network/periodic_state.hpp"
#include "network/series_recorder.hpp"
#include "network/start_state.hpp"
#include "tests/case_runner.hpp"
#include "tests/unit/network/network_cases_support.hpp"

namespace stillzone::network {
namespace {

using testing::every_flow_case;
using testing::find_column;
using testing::kSludge;
using testing::load_file;
using testing::load_text;
using testing::one_tank_case;
using testing::run;
using testing::series_value;
using testing::value_in;
using testing::zone_value;

constexpr const char* kSteady = R"({ "kind": "steady", "start": "seeded" })";

std::filesystem::path source(const std::string& below) {
  return std::filesystem::path(STILLZONE_SOURCE_DIR) / below;
}

/// Largest relative difference of the end states of two runs of one case; what is below its floor
/// counts against the floor.
double difference(const RunResult& a, const RunResult& b, const Case& the_case) {
  double worst = 0.0;
  for (std::size_t z = 0; z < a.zones.size(); ++z) {
    for (std::size_t i = 0; i < the_case.kinetics.components.size(); ++i) {
      const double x = a.zones[z].state[i].value;
      const double y = b.zones[z].state[i].value;
      const double size = std::max(std::abs(y), the_case.kinetics.components[i].floor);
      worst = std::max(worst, std::abs(x - y) / size);
    }
  }
  return worst;
}

void expect_closed(const RunResult& result) {
  ASSERT_EQ(result.balances.size(), 4U);
  for (const Balance& balance : result.balances) {
    EXPECT_LT(balance.relative_error, 1e-9) << balance.name;
  }
}

// ------------------------------------------------------------------------------------- balances

/// As shipped (method chosen automatically) and with the one-step method to 1e-9. The multistep
/// method, forced on operation that switches often, keeps the tolerance of the run only (1.8e-7 of
/// the COD in 2939 switches, measured).
TEST(Balances, CloseInEveryShippedCase) {
  int n_cases = 0;
  for (const auto& entry : std::filesystem::directory_iterator(source("cases"))) {
    if (entry.path().extension() != ".json") continue;
    core::FaultList faults;
    const auto document = core::JsonDocument::read(entry.path(), faults);
    ASSERT_TRUE(document.has_value()) << faults.text();
    if (document->root().value("stillzone", "") != "case/1") continue;
    for (const char* integrator : {"automatic", "one-step", "multistep"}) {
      const auto loaded = load_file(entry.path());
      ASSERT_NE(loaded, nullptr);
      loaded->the_case.run.integrator = integrator;
      SCOPED_TRACE(entry.path().string() + " " + integrator);
      const RunResult result = run(*loaded);
      const double limit =
          std::string(integrator) == "multistep" ? loaded->the_case.run.tolerance : 1e-9;
      ASSERT_EQ(result.balances.size(), 4U);
      for (const Balance& balance : result.balances) {
        EXPECT_LT(balance.relative_error, limit) << balance.name;
      }
    }
    ++n_cases;
  }
  EXPECT_GT(n_cases, 0);
}

/// The one-step formula keeps books and state together to rounding. The multistep method leaves
/// what its Newton iteration leaves: a hundredth of the tolerance at most.
TEST(Balances, CloseWithEveryKindOfFlowAndSchedules) {
  const auto closure_of = [](const char* integrator, double tolerance) {
    const auto loaded = load_text(every_flow_case(
        R"("adm1")", kSludge, R"({ "kind": "dynamic", "start": "steady", "until": "5 d" })"));
    EXPECT_NE(loaded, nullptr);
    loaded->the_case.run.integrator = integrator;
    loaded->the_case.run.tolerance = tolerance;
    const RunResult result = run(*loaded);
    EXPECT_NEAR(result.balances[0].inflow, 170.0 * 5.0, 1e-8);
    double worst = 0.0;
    for (const Balance& balance : result.balances) {
      worst = std::max(worst, balance.relative_error);
    }
    return worst;
  };
  EXPECT_LT(closure_of("one-step", 1e-4), 1e-12);
  EXPECT_LT(closure_of("one-step", 1e-6), 1e-12);
  EXPECT_LT(closure_of("multistep", 1e-6), 1e-8);
  EXPECT_LT(closure_of("multistep", 1e-8), 1e-10);
}

/// The two-step model as published makes COD and carbon. With what the model makes counted, the
/// books of a run close as those of any other model; without it they do not.
TEST(Balances, CloseForAModelThatDoesNotCloseOnceWhatItMakesIsCounted) {
  for (const char* integrator : {"one-step", "multistep"}) {
    SCOPED_TRACE(integrator);
    const auto loaded = load_text(every_flow_case(
        R"("two_step")", R"({ "S1": 9.5, "S2": 90, "Z": 120, "C": 130 })",
        R"({ "kind": "dynamic", "start": "seeded", "until": "5 d", "tolerance": 1e-8 })"));
    ASSERT_NE(loaded, nullptr);
    loaded->the_case.run.integrator = integrator;
    const RunResult result = run(*loaded);
    expect_closed(result);
    for (const std::size_t which : {1U, 2U}) {  // COD, C
      const Balance& balance = result.balances.at(which);
      EXPECT_GT(std::abs(balance.made), 1e-3 * balance.inflow) << balance.name;
      EXPECT_NEAR(balance.inflow + balance.made,
                  balance.liquid_out + balance.gas_out + balance.stored_change,
                  1e-8 * balance.inflow)
          << balance.name;
    }
    EXPECT_EQ(result.balances.at(3).made, 0.0);  // it holds no nitrogen
  }
}

/// A ledger that forgot a stream would not notice: the books are checked against the state in
/// digester_system_test. Here: the numbers are those of the case.
TEST(Balances, OfASteadyStateCountTheFeedPerDay) {
  const auto loaded = load_text(one_tank_case("", "{}", kSteady));
  ASSERT_NE(loaded, nullptr);
  const RunResult result = run(*loaded);
  expect_closed(result);
  EXPECT_NEAR(result.balances[1].inflow, 170.0 * (5.0 + 20.0 + 5.0 + 25.0 + 2.0 + 0.1), 1e-9);
  EXPECT_NEAR(result.balances[1].liquid_out + result.balances[1].gas_out, result.balances[1].inflow,
              1e-5);
  EXPECT_EQ(result.balances[3].gas_out, 0.0);  // no nitrogen in the gas of this model
}

// ----------------------------------------------------------------------------------- integrators

/// The stated accuracy: both methods agree with a run 100 times tighter to 100 times the tolerance.
TEST(Integrators, AgreeWithEachOtherAndWithAHundredTimesTighter) {
  const auto run_at = [&](const char* integrator, double tolerance) {
    const auto loaded = load_text(every_flow_case(
        R"("adm1")", kSludge, R"({ "kind": "dynamic", "start": "steady", "until": "3 d" })"));
    loaded->the_case.run.integrator = integrator;
    loaded->the_case.run.tolerance = tolerance;
    return run(*loaded);
  };
  const auto loaded = load_text(every_flow_case(R"("adm1")", kSludge, kSteady));
  ASSERT_NE(loaded, nullptr);
  const RunResult tight = run_at("one-step", 1e-8);
  EXPECT_LT(difference(run_at("one-step", 1e-6), tight, loaded->the_case), 1e-4);
  EXPECT_LT(difference(run_at("multistep", 1e-6), tight, loaded->the_case), 1e-4);
  EXPECT_LT(difference(run_at("multistep", 1e-8), tight, loaded->the_case), 1e-6);
}

/// Ion equilibria in no time beside hydrolysis over days; feed 5 min a day, mixing 12 min an hour,
/// a gas pipe that opens and closes (a check valve and a small headspace).
TEST(Integrators, PassSixtyDaysOfStiffSwitchingOperation) {
  const std::string text = R"({ "stillzone": "case/1", "title": "stiff and switching",
  "temperature": "35 degC", "kinetics": "adm1",
  "zones": {
    "top":   { "volume": "1500 m3", "gas": { "to": "dome", "kLa": "200 1/d" } },
    "floor": { "volume": "500 m3", "gas": { "to": "dome", "kLa": "20 1/d" } } },
  "headspaces": { "dome": { "volume": "40 m3", "pipe": { "coefficient": "5e5 m3/d/bar",
    "back_pressure": "1.013 bar", "opening_pressure": "0.03 bar" } } },
  "feeds": { "sludge": { "flow": "100 m3/d", "schedule": "pulse", "state": )" +
                           std::string(kSludge) + R"( } },
  "outlets": ["overflow"],
  "schedules": { "pulse": { "every": "1 d", "on_for": "5 min", "idle": 0 },
                 "mixing": { "every": "1 h", "on_for": "12 min", "idle": 0.01 } },
  "flows": [ { "from": "sludge", "to": "top" }, { "from": "top", "to": "overflow" },
             { "between": ["top", "floor"], "flow": "8000 m3/d", "schedule": "mixing" } ],
  "run": { "kind": "dynamic", "start": "steady", "until": "60 d", "record_every": "12 h" } })";
  const auto loaded = load_text(text);
  ASSERT_NE(loaded, nullptr);
  const RunResult result = run(*loaded);
  expect_closed(result);
  EXPECT_NEAR(static_cast<double>(result.solver.switches), 60.0 * 24.0 * 2.0 + 60.0, 62.0);
  loaded->the_case.run.tolerance = 1e-8;
  const RunResult tight = run(*loaded);
  EXPECT_LT(difference(result, tight, loaded->the_case), 1e-4);
}

// -------------------------------------------------------------------------------------- gas pipe

constexpr const char* kFillingHeadspace =
    R"({ "kind": "dynamic", "until": "2 d", "record_every": "0.01 d", "tolerance": 1e-9,
         "integrator": "one-step",
         "start": { "tank": { "S_su": 0.012, "S_aa": 0.0053, "S_fa": 0.0986, "S_va": 0.0116,
           "S_bu": 0.0133, "S_pro": 0.0158, "S_ac": 0.1976, "S_h2": 2.36e-7, "S_ch4": 0.0551,
           "S_IC": 0.1527, "S_IN": 0.1302, "S_I": 0.3287, "X_c": 0.3087, "X_ch": 0.0279,
           "X_pr": 0.1026, "X_li": 0.0295, "X_su": 0.4202, "X_aa": 1.1792, "X_fa": 0.243,
           "X_c4": 0.4319, "X_pro": 0.1373, "X_ac": 0.7606, "X_h2": 0.317, "X_I": 25.6174,
           "S_cat": 0.04, "S_an": 0.02 }, "dome": { "S_gas_ch4": 0.05 } } })";

/// The headspace fills, the pipe opens, the flow settles.
TEST(GasPipe, HistoryDoesNotDependOnTheWidthOfItsBlend) {
  const auto loaded = load_text(one_tank_case("", "{}", kFillingHeadspace));
  ASSERT_NE(loaded, nullptr);
  const auto end_with_width = [&](double width) {
    DigesterSystem system(loaded->the_case, loaded->balance, {.pipe_opening_width = width});
    const auto solver = core::make_klu_solver(system.pattern());
    core::IntegratorOptions options;
    options.relative_tolerance = 1e-9;
    const auto integrator =
        core::make_integrator(core::IntegratorKind::one_step, system, *solver, options);
    auto y = start_state(loaded->the_case, system);
    EXPECT_TRUE(y.ok());
    std::vector<double> q(system.n_quadratures(), 0.0);
    core::IntegrationRequest request;
    request.until = 0.5;
    EXPECT_TRUE(integrator->integrate(request, y.value(), q).ok());
    std::vector<double> all = y.value();
    all.push_back(q[Ledger::at(Conserved::cod, Ledger::Entry::gas_out)]);
    return all;
  };
  const auto reference = end_with_width(kPipeOpeningWidth);
  EXPECT_GT(reference.back(), 0.0);  // it did open
  for (const double factor : {0.1, 10.0}) {
    const auto other = end_with_width(factor * kPipeOpeningWidth);
    for (std::size_t i = 0; i < other.size(); ++i) {
      EXPECT_NEAR(other[i], reference[i], 1e-7 * std::abs(reference[i]) + 1e-13) << i;
    }
  }
}

TEST(GasPipe, NothingComesInThroughItWhileTheHeadspaceIsBelowTheOutside) {
  const auto loaded = load_text(one_tank_case("", "{}", kFillingHeadspace));
  ASSERT_NE(loaded, nullptr);
  const RunResult result = run(*loaded);
  const auto* pressure = find_column(result.series, "dome", "pressure");
  const auto* flow = find_column(result.series, "dome", "gas_flow");
  ASSERT_TRUE(pressure != nullptr && flow != nullptr);
  EXPECT_LT(pressure->values.front(), 0.2);
  EXPECT_GT(flow->values.back(), 1000.0);
  for (std::size_t k = 0; k < flow->values.size(); ++k) {
    EXPECT_GE(flow->values[k], 0.0);
    if (pressure->values[k] < 1.013) {
      EXPECT_EQ(flow->values[k], 0.0);
    }
  }
}

// ------------------------------------------------------------------------------ facts of the trade

/// Common practice, no source.
TEST(SurfaceLimitedGasTransfer, LeavesMoreMethaneDissolvedAndChangesTheGas) {
  const auto case_with = [&](const char* bottom_gas) {
    return R"({ "stillzone": "case/1", "title": "surface", "temperature": "35 degC",
    "kinetics": "adm1",
    "zones": { "top": { "volume": "400 m3", "gas": { "to": "dome", "kLa": "200 1/d" } },
               "deep": { "volume": "3000 m3" )" +
           std::string(bottom_gas) + R"( } },
    "headspaces": { "dome": { "volume": "300 m3",
      "pipe": { "coefficient": "5e4 m3/d/bar", "back_pressure": "1.013 bar" } } },
    "feeds": { "sludge": { "flow": "170 m3/d", "state": )" +
           std::string(kSludge) + R"( } }, "outlets": ["overflow"],
    "flows": [ { "from": "sludge", "to": "deep" }, { "from": "deep", "to": "overflow" },
               { "between": ["deep", "top"], "flow": "6000 m3/d" } ],
    "run": { "kind": "steady", "start": "seeded" } })";
  };
  const auto surface = load_text(case_with(""));
  const auto everywhere = load_text(case_with(R"(, "gas": { "to": "dome", "kLa": "200 1/d" })"));
  ASSERT_TRUE(surface && everywhere);
  const RunResult limited = run(*surface);
  const RunResult ideal = run(*everywhere);
  EXPECT_GT(zone_value(limited, "deep", "S_ch4"), 2.0 * zone_value(ideal, "deep", "S_ch4"));
  EXPECT_GT(
      std::abs(limited.headspaces[0].methane_share_dry - ideal.headspaces[0].methane_share_dry),
      1e-4);  // a steady state is found to 1e-9
}

/// Common practice, no source: a jump up at each feed, a slow fall between.
TEST(PulseFeeding, GivesSawtoothParticulates) {
  const auto loaded = load_text(one_tank_case(
      R"(, "schedule": "pulse")", R"({ "pulse": { "every": "1 d", "on_for": "15 min" } })",
      R"({ "kind": "dynamic", "start": "steady", "until": "10 d", "record_every": "15 min" })"));
  ASSERT_NE(loaded, nullptr);
  const RunResult result = run(*loaded);
  expect_closed(result);
  const auto* protein = find_column(result.series, "tank", "X_pr");
  ASSERT_NE(protein, nullptr);
  for (int day = 5; day < 10; ++day) {
    const auto at = [&](double t) { return series_value(result.series, "tank", "X_pr", t); };
    const double start = day;
    EXPECT_NEAR(at(start + 0.25 / 24.0) - at(start), 170.0 * 20.0 / 3400.0, 0.15) << day;
    double before = at(start + 0.25 / 24.0);
    for (int quarter = 2; quarter <= 96; ++quarter) {
      const double now = at(start + quarter * 0.25 / 24.0);
      EXPECT_LT(now, before) << day << " " << quarter;
      before = now;
    }
  }
}

/// Common practice, no source: one zone carries 20 to 40 unknowns.
TEST(OneZone, CarriesTwentyToFortyUnknowns) {
  const auto loaded = load_text(one_tank_case("", "{}", kSteady));
  ASSERT_NE(loaded, nullptr);
  const RunResult result = run(*loaded);
  EXPECT_EQ(result.unknowns, 26U + 1U + 3U);
}

// ------------------------------------------------------------------------------------- limits

TEST(HugeExchange, MakesManyZonesOneTank) {
  const auto one = load_file(source("tests/published/adm1/s0.case.json"));
  const auto four = load_file(source("tests/published/adm1/s7.case.json"));
  ASSERT_TRUE(one && four);
  const RunResult tank = run(*one);
  const RunResult zones = run(*four);
  // Four zones in a row exchange 1e7 m3/d: they differ from one tank by some of V rate / 1e7, where
  // the fastest rate that matters here is that of protein hydrolysis (10 1/d): 3e-3 of X_pr.
  for (const auto& zone : zones.zones) {
    for (const NamedValue& value : zone.state) {
      const double expected = value_in(tank.zones[0].state, value.name);
      EXPECT_NEAR(value.value, expected, 5e-3 * expected + 1e-12) << zone.place << value.name;
    }
  }
  EXPECT_NEAR(zones.headspaces[0].gas_flow, tank.headspaces[0].gas_flow, 1e-3 * 2955.7);
}

// --------------------------------------------------------------------------------------- results

TEST(RunResult, FlowsOfADynamicRunAreTimeMeansAndGoWithTheOutlets) {
  const auto loaded = load_text(every_flow_case(
      R"("inert")", R"({ "S_tracer": 1 })",
      R"({ "kind": "dynamic", "start": "seeded", "until": "2 d", "record_every": "1 h" })"));
  ASSERT_NE(loaded, nullptr);
  const RunResult result = run(*loaded);
  double out = 0.0;
  for (const FlowResult& flow : result.flows) {
    if (flow.to == "overflow" || flow.to == "bottom") out += flow.flow;
  }
  EXPECT_NEAR(out, 170.0, 1e-9);
  EXPECT_NEAR(result.outlets[0].flow + result.outlets[1].flow, 170.0, 1e-9);
  EXPECT_EQ(result.series.time.size(), 49U);
  // The feed's flow while it is on: the daily volume in six hours.
  EXPECT_NEAR(series_value(result.series, "sludge", "flow", 3.0 / 24.0), 600.0, 1e-9);
  EXPECT_EQ(series_value(result.series, "sludge", "flow", 0.0), 0.0);
}

TEST(RunResult, OutletWithABypassIsTheFlowWeightedMix) {
  const auto loaded = load_file(source("tests/published/adm1/s1.case.json"));
  ASSERT_NE(loaded, nullptr);
  const RunResult result = run(*loaded);
  const double mixed = (144.5 * zone_value(result, "z1", "X_pr") + 25.5 * 20.0) / 170.0;
  EXPECT_NEAR(value_in(result.outlets[0].state.state, "X_pr"), mixed, 1e-12 * mixed);
  // pH of the mixture lies between that of the zone and that of the feed (5.4 or so), and is not
  // the mean of the two.
  const double ph = value_in(result.outlets[0].state.state, "pH");
  EXPECT_LT(ph, zone_value(result, "z1", "pH"));
  EXPECT_GT(ph, 6.0);
}

TEST(RunResult, GasFlowsObeyTheIdealGasLaw) {
  const auto loaded = load_file(source("tests/published/adm1/s0.case.json"));
  ASSERT_NE(loaded, nullptr);
  const RunResult result = run(*loaded);
  const HeadspaceResult& dome = result.headspaces[0];
  const double vapour = value_in(dome.state.derived, "p_water_vapour");
  // wet at 1.013 bar and 35 degC -> dry at 1.01325 bar and 0 degC
  const double dry = dome.gas_flow * (1.013 / 1.01325) * (273.15 / 308.15) *
                     (dome.pressure - vapour) / dome.pressure;
  EXPECT_NEAR(dome.gas_flow_normal_dry, dry, 1e-9 * dry);
  EXPECT_NEAR(dome.methane_flow_normal, dry * dome.methane_share_dry, 1e-9 * dry);
  EXPECT_NEAR(dome.pressure,
              vapour + value_in(dome.state.derived, "p_S_gas_h2") +
                  value_in(dome.state.derived, "p_S_gas_ch4") +
                  value_in(dome.state.derived, "p_S_gas_co2"),
              1e-12);
}

TEST(RecordTimes, HaveBothEndsAndEveryMultiple) {
  const std::vector<double> expected = {0.0, 0.3, 0.6, 0.9, 1.0};
  const auto times = record_times(0.0, 1.0, 0.3);
  ASSERT_EQ(times.size(), expected.size());
  for (std::size_t k = 0; k < times.size(); ++k) EXPECT_NEAR(times[k], expected[k], 1e-15);
  EXPECT_EQ(record_times(0.0, 60.0, 0.1).size(), 601U);
  EXPECT_EQ(record_times(2.0, 2.0, 0.1).size(), 1U);
}

// ---------------------------------------------------------------------------------- steady states

TEST(SteadyState, SaysWhichGroupsLive) {
  const auto healthy = load_text(one_tank_case("", "{}", kSteady));
  ASSERT_NE(healthy, nullptr);
  EXPECT_NE(run(*healthy).solution_note.find("every microbial group lives"), std::string::npos);
  // Twenty times the flow: no methane former can stay (retention 1 d).
  auto overloaded = load_text(one_tank_case("", "{}", kSteady));
  overloaded->the_case.feeds[0].flow.value = 3400.0;
  const RunResult result = run(*overloaded);
  EXPECT_NE(result.solution_note.find("washed out"), std::string::npos) << result.solution_note;
}

TEST(SteadyState, OfAScheduledCaseIsThatOfTheMeanConditionsAndSaysSo) {
  const auto pulsed =
      load_text(one_tank_case(R"(, "schedule": "pulse")",
                              R"({ "pulse": { "every": "1 d", "on_for": "15 min" } })", kSteady));
  const auto steady = load_text(one_tank_case("", "{}", kSteady));
  ASSERT_TRUE(pulsed && steady);
  const RunResult result = run(*pulsed);
  EXPECT_LT(difference(result, run(*steady), steady->the_case), 1e-9);
  ASSERT_FALSE(result.warnings.empty());
  EXPECT_NE(result.warnings[0].find("mean conditions"), std::string::npos);
}

TEST(DynamicRun, FromTheSteadyStateOfAConstantCaseStaysThere) {
  const auto loaded = load_text(
      one_tank_case("", "{}", R"({ "kind": "dynamic", "start": "steady", "until": "20 d" })"));
  const auto steady = load_text(one_tank_case("", "{}", kSteady));
  ASSERT_TRUE(loaded && steady);
  EXPECT_LT(difference(run(*loaded), run(*steady), steady->the_case), 1e-6);
}

// --------------------------------------------------------------------------------- periodic states

constexpr const char* kPeriodic = R"({ "kind": "periodic", "start": "steady" })";

TEST(PeriodicState, RepeatsItself) {
  const auto loaded =
      load_text(one_tank_case(R"(, "schedule": "pulse")",
                              R"({ "pulse": { "every": "1 d", "on_for": "1 h" } })", kPeriodic));
  ASSERT_NE(loaded, nullptr);
  const RunResult result = run(*loaded);
  expect_closed(result);
  ASSERT_FALSE(result.series.columns.empty());
  for (const auto& column : result.series.columns) {
    if (column.place != "tank") continue;
    EXPECT_NEAR(column.values.front(), column.values.back(),
                2e-6 * std::abs(column.values.front()) + 1e-9)
        << column.quantity;
  }
}

TEST(PeriodicState, NeedsSomethingThatRepeats) {
  const auto loaded = load_text(one_tank_case("", "{}", kPeriodic));
  ASSERT_NE(loaded, nullptr);
  const auto result = run_case(loaded->the_case, loaded->balance, {});
  ASSERT_FALSE(result.ok());
  EXPECT_EQ(result.failure().reason, "nothing in this case switches, so there is no period");
  EXPECT_EQ(result.failure().try_this, "Use run kind \"steady\".");
}

TEST(PeriodicState, HasTheLeastCommonPeriodOfItsSchedules) {
  auto loaded = load_text(every_flow_case(R"("inert")", R"({ "S_tracer": 1 })", kPeriodic));
  ASSERT_NE(loaded, nullptr);
  const auto period = common_period(loaded->the_case);
  ASSERT_TRUE(period.ok());
  EXPECT_NEAR(period.value(), 1.0, 1e-12);
}

}  // namespace
}  // namespace stillzone::network
