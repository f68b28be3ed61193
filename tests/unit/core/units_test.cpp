#include "core/units.hpp"

#include <gtest/gtest.h>

#include <cstdlib>
#include <stdexcept>
#include <string>

namespace stillzone::core {
namespace {

class Units : public testing::Test {
 protected:
  double value(const char* text, Measure measure) {
    const UnitReading reading = units_.read(text, measure);
    EXPECT_TRUE(reading.value.has_value()) << text << ": " << reading.problem;
    return reading.value.value_or(-1e300);
  }
  std::string problem(const char* text, Measure measure) {
    const UnitReading reading = units_.read(text, measure);
    EXPECT_FALSE(reading.value.has_value()) << text;
    return reading.problem;
  }
  UnitReader units_;
};

// 1 US gallon = 231 in3 = 3.785411784 L exactly (NIST Handbook 44, Appendix C).
constexpr double kGallon = 0.003785411784;

TEST_F(Units, NumberAndUnitAreSplitBeforeTheUnitIsParsed) {
  EXPECT_DOUBLE_EQ(value("35 degC", Measure::temperature), 308.15);
  EXPECT_NEAR(value("95 degF", Measure::temperature), 308.15, 1e-10);
  EXPECT_DOUBLE_EQ(value("300 K", Measure::temperature), 300.0);
  EXPECT_DOUBLE_EQ(value("35degC", Measure::temperature), 308.15);
  EXPECT_DOUBLE_EQ(value("35 °C", Measure::temperature), 308.15);
}

TEST_F(Units, TemperatureDifferencesHaveNoOffset) {
  EXPECT_DOUBLE_EQ(value("2 degC", Measure::temperature_change), 2.0);
  EXPECT_NEAR(value("9 degF", Measure::temperature_change), 5.0, 1e-12);
}

TEST_F(Units, GallonsAreUsGallonsAndMgAMillionOfThem) {
  EXPECT_NEAR(value("1 gal", Measure::volume), kGallon, 1e-15);
  EXPECT_NEAR(value("0.6 MG", Measure::volume), 0.6e6 * kGallon, 1e-9);
  EXPECT_NEAR(value("1 MGD", Measure::flow), 1e6 * kGallon, 1e-9);
  EXPECT_NEAR(value("1 mgd", Measure::flow), 1e6 * kGallon, 1e-9);
  EXPECT_NEAR(value("1 gpm", Measure::flow), 1440.0 * kGallon, 1e-12);
  EXPECT_NEAR(value("1 gpd", Measure::flow), kGallon, 1e-15);
}

TEST_F(Units, OtherWordsOfTheTrade) {
  EXPECT_NEAR(value("1 cfm", Measure::flow), 1440.0 * 0.028316846592, 1e-10);
  EXPECT_NEAR(value("35 rpm", Measure::rotation), 35.0 * 1440.0, 1e-8);
  EXPECT_NEAR(value("2 kWh", Measure::energy), 2.0, 1e-14);
  EXPECT_NEAR(value("1 cP", Measure::dynamic_viscosity), 1e-3, 1e-18);
  EXPECT_DOUBLE_EQ(value("7 Nm3", Measure::volume), 7.0);
  EXPECT_NEAR(value("1 inH2O", Measure::pressure), 0.0024908891, 1e-12);
  EXPECT_NEAR(value("1 psi", Measure::pressure), 0.0689475729, 1e-9);
  EXPECT_NEAR(value("1 hp", Measure::power), 745.69987158, 1e-7);
  EXPECT_DOUBLE_EQ(value("1 yr", Measure::duration), 365.25);
  EXPECT_DOUBLE_EQ(value("1 year", Measure::duration), 365.25);
}

TEST_F(Units, HorsepowerPerThousandCubicFeetIsAPowerPerVolume) {  // MIX-1 of the criteria
  EXPECT_NEAR(value("0.2 hp/1000 ft3", Measure::unit_power), 5.2668, 1e-4);
  EXPECT_NEAR(value("0.3 hp/(1000 ft3)", Measure::unit_power), 7.9002, 1e-4);
}

TEST_F(Units, BlanksAndExponentsDoNotMatter) {
  EXPECT_DOUBLE_EQ(value("  170 m3/d ", Measure::flow), 170.0);
  EXPECT_DOUBLE_EQ(value("1.7e2 m3/d", Measure::flow), 170.0);
  EXPECT_NEAR(value("12 min", Measure::duration), 12.0 / 1440.0, 1e-17);
  EXPECT_DOUBLE_EQ(value("7 1/d", Measure::rate), 7.0);
  EXPECT_DOUBLE_EQ(value("2 m³", Measure::volume), 2.0);
  EXPECT_NEAR(value("5e4 m3/d/bar", Measure::gas_conductance), 5e4, 1e-8);
}

TEST_F(Units, SharesMayBePercentOrBare) {
  EXPECT_DOUBLE_EQ(value("5 %", Measure::share), 0.05);
  EXPECT_DOUBLE_EQ(value("0.05", Measure::share), 0.05);
}

TEST_F(Units, MessagesSayWhatIsWrong) {
  EXPECT_EQ(problem("170", Measure::flow), "a flow needs its unit");
  EXPECT_EQ(problem("170 m3", Measure::flow), "\"m3\" measures a volume, and a flow is needed");
  EXPECT_EQ(problem("170 m3/fortnite", Measure::flow), "unit \"m3/fortnite\" is not known");
  EXPECT_EQ(problem("35 C", Measure::temperature), "unit \"C\" is the coulomb, not a temperature");
  EXPECT_EQ(problem("1,200 m3", Measure::volume),
            "numbers have a decimal point and no thousands separators");
  EXPECT_EQ(problem("1 200 m3", Measure::volume), "numbers have no blanks inside");
  EXPECT_EQ(problem("many m3", Measure::volume), "a volume starts with a number");
  EXPECT_EQ(problem("1e999 m3", Measure::volume), "the number of a volume must be finite");
  EXPECT_EQ(problem("nan m3", Measure::volume), "the number of a volume must be finite");
  EXPECT_EQ(problem("", Measure::volume), "a volume starts with a number");
}

TEST_F(Units, ValuesOutsideWhatNaturePermitsAreRefused) {
  EXPECT_EQ(problem("-300 degC", Measure::temperature),
            "this is below absolute zero (-273.15 degC)");
  EXPECT_EQ(problem("1e308 MG", Measure::volume), "the number of a volume must be finite");
  EXPECT_DOUBLE_EQ(value("-2 degC", Measure::temperature_change), -2.0);
}

TEST_F(Units, NoBreakSpacesAreBlanks) {
  EXPECT_DOUBLE_EQ(value("170\u00A0m3/d", Measure::flow), 170.0);
  EXPECT_DOUBLE_EQ(value("170\u202Fm3/d", Measure::flow), 170.0);
  EXPECT_EQ(problem("1\u00A0200 m3", Measure::volume), "numbers have no blanks inside");
}

TEST_F(Units, ANormalCubicMetreIsNoNewtonMetre) {
  EXPECT_DOUBLE_EQ(value("5 Nm3/d", Measure::flow), 5.0);
  EXPECT_DOUBLE_EQ(value("5 Nm^3", Measure::volume), 5.0);
  EXPECT_DOUBLE_EQ(value("5 Nm³", Measure::volume), 5.0);
  EXPECT_EQ(problem("5 Nm", Measure::length), "unit \"Nm\" is not known");
}

TEST_F(Units, RadiansAreNoRevolutions) {
  EXPECT_EQ(problem("3 rad/s", Measure::rotation),
            "\"rad/s\" counts radians, and revolutions are needed");
}

TEST_F(Units, ShiftedAndLogarithmicUnitsAreRefused) {
  EXPECT_EQ(problem("35 K @ 273.15", Measure::temperature), "unit \"K @ 273.15\" is not known");
  EXPECT_EQ(problem("3 lg(re 1 K)", Measure::temperature), "unit \"lg(re 1 K)\" is not known");
  EXPECT_EQ(problem("3 degC", Measure::duration),
            "\"degC\" measures a temperature, and a duration is needed");
}

TEST_F(Units, EndlessUnitsAreRefusedAtOnce) {
  const std::string blanks = "1 m3/" + std::string(200000, ' ') + "d";
  EXPECT_EQ(problem(blanks.c_str(), Measure::flow), "a unit of 200004 characters");
  const std::string brackets = "1 " + std::string(200000, '(');
  EXPECT_EQ(problem(brackets.c_str(), Measure::flow), "a unit of 200000 characters");
  std::string why;
  EXPECT_FALSE(units_.scale_between(std::string(500, '('), "1/d", why));
  EXPECT_EQ(why, "a unit of 500 characters");
}

TEST_F(Units, WayOutShowsTheMeasuresUnits) {
  EXPECT_EQ(units_.read("170", Measure::flow).way_out,
            "Write it as a number and one of m3/d, m3/h, L/s, gpm, MGD.");
  EXPECT_EQ(units_.read("1,200 m3", Measure::volume).way_out,
            "Write 1200.5, not 1,200.5 or 1.200,5.");
}

TEST_F(Units, EveryMeasureReadsItsInternalUnitAsOne) {
  for (int i = 0; i < static_cast<int>(Measure::share); ++i) {
    const auto measure = static_cast<Measure>(i);
    const std::string text = "1 " + std::string(internal_unit(measure));
    EXPECT_NEAR(value(text.c_str(), measure), 1.0, 1e-14) << text;
  }
}

TEST_F(Units, EveryExampleUnitIsRead) {
  for (int i = 0; i < static_cast<int>(Measure::share); ++i) {
    const auto measure = static_cast<Measure>(i);
    std::string examples(example_units(measure));
    while (!examples.empty()) {
      const auto comma = examples.find(", ");
      const std::string text = "1 " + examples.substr(0, comma);
      EXPECT_TRUE(units_.read(text, measure).value.has_value()) << text;
      examples = comma == std::string::npos ? "" : examples.substr(comma + 2);
    }
  }
}

TEST(UnitDatabase, MissingIsSaidWithThePlaceLookedAt) {
  ASSERT_EQ(setenv("UDUNITS2_XML_PATH", "/no/such/udunits2.xml", 1), 0);
  std::string message;
  try {
    const UnitReader reader;
  } catch (const std::runtime_error& error) {
    message = error.what();
  }
  unsetenv("UDUNITS2_XML_PATH");
  EXPECT_EQ(message,
            "the UDUNITS-2 unit database is missing or damaged (looked for "
            "/no/such/udunits2.xml). Install the package libudunits2-data, or set "
            "UDUNITS2_XML_PATH to udunits2.xml.");
}

TEST_F(Units, ModelUnitsOfTheLiteratureConvert) {
  const auto scale = [&](const char* from, const char* to) {
    std::string why;
    const auto found = units_.scale_between(from, to, why);
    EXPECT_TRUE(found) << from << ": " << why;
    return found.value_or(UnitReader::Scale{-1.0, 0.0});
  };
  EXPECT_NEAR(scale("mmol/L", "kmol/m3").scale, 1e-3, 1e-17);
  EXPECT_NEAR(scale("meq/L", "kmol/m3").scale, 1e-3, 1e-17);
  EXPECT_NEAR(scale("kgCOD/m3", "kg COD/m3").scale, 1.0, 1e-15);
  EXPECT_NEAR(scale("kg COD/m3/d", "g COD/L/h").scale, 1.0 / 24.0, 1e-15);
  EXPECT_NEAR(scale("m3/kg COD/d", "m3/kg COD/h").scale, 1.0 / 24.0, 1e-15);
  EXPECT_NEAR(scale("mbar", "bar").scale, 1e-3, 1e-17);
  EXPECT_NEAR(scale("kJ/mol", "J/mol").scale, 1e3, 1e-9);
  EXPECT_NEAR(scale("degC", "K").offset, 273.15, 1e-12);  // "degC" is no gram of carbon
}

TEST_F(Units, ParameterUnitsConvertWhenTheyCountTheSame) {
  std::string problem;
  const auto per_day = units_.scale_between("1/h", "1/d", problem);
  ASSERT_TRUE(per_day) << problem;
  EXPECT_NEAR(per_day->scale, 24.0, 1e-12);
  const auto cod = units_.scale_between("g COD/m3", "kg COD/m3", problem);
  ASSERT_TRUE(cod) << problem;
  EXPECT_NEAR(cod->scale, 1e-3, 1e-18);
  const auto molar = units_.scale_between("M", "kmol/m3", problem);
  ASSERT_TRUE(molar) << problem;
  EXPECT_NEAR(molar->scale, 1.0, 1e-15);
  EXPECT_FALSE(units_.scale_between("kg COD/m3", "kg C/m3", problem));
  EXPECT_EQ(problem, "\"kg COD/m3\" does not count what \"kg C/m3\" counts");
  EXPECT_FALSE(units_.scale_between("bar", "1/d", problem));
}

}  // namespace
}  // namespace stillzone::core
