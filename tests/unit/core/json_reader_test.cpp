#include "core/json_reader.hpp"

#include <gtest/gtest.h>

namespace stillzone::core {
namespace {

JsonDocument parsed(const char* text) {
  FaultList faults;
  auto result = JsonDocument::parse(text, "c.json", ".", faults);
  EXPECT_TRUE(result.has_value()) << faults.text();
  return std::move(result).value();
}

class Reading {
 public:
  explicit Reading(const char* text) : document_(parsed(text)) {}
  ObjectReader reader() { return {context_, document_.root(), ""}; }
  FaultList faults;
  std::vector<FreeQuantity> free_quantities;

 private:
  JsonDocument document_;
  UnitReader units_;
  ReadingContext context_{document_, units_, faults, free_quantities};
};

TEST(ObjectReader, QuantitiesMayBeFreeOrUncertain) {
  Reading reading(
      R"({"v": {"value": "600 m3", "fit": ["100 m3", "1500 m3"], "spread": {"normal": "60 m3"}}})");
  auto reader = reading.reader();
  const auto v = reader.quantity<Measure::volume>("v", ObjectReader::Need::required,
                                                  ObjectReader::positive(Measure::volume));
  reader.finish();
  EXPECT_TRUE(reading.faults.empty()) << reading.faults.text();
  EXPECT_DOUBLE_EQ(v.value().value(), 600.0);
  ASSERT_EQ(reading.free_quantities.size(), 1U);
  EXPECT_EQ(reading.free_quantities[0].pointer, "/v");
  EXPECT_DOUBLE_EQ(reading.free_quantities[0].fit_high.value(), 1500.0);
  EXPECT_DOUBLE_EQ(reading.free_quantities[0].spread.value().a, 60.0);
}

TEST(ObjectReader, FaultsTeach) {
  Reading reading(R"({"volum": 3, "flow": 170, "x": "-1 m3"})");
  auto reader = reading.reader();
  (void)reader.quantity<Measure::volume>("volume", ObjectReader::Need::required, {});
  (void)reader.quantity<Measure::flow>("flow", ObjectReader::Need::required, {});
  (void)reader.quantity<Measure::volume>("x", ObjectReader::Need::required,
                                         ObjectReader::positive(Measure::volume));
  reader.finish();
  EXPECT_EQ(reading.faults.text(),
            "c.json (line 1): no \"volume\"; \"volume\" is needed: a volume, like \"1 m3\". Add "
            "\"volume\".\n"
            "c.json /flow (line 1): 170; a flow needs its unit. Write \"170 m3/d\" (or m3/d, m3/h, "
            "L/s, gpm, MGD).\n"
            "c.json /x (line 1): \"-1 m3\"; a volume must be > 0 here.\n"
            "c.json /volum (line 1): key \"volum\"; this key is not known here. Did you mean "
            "\"volume\"?\n");
}

using Need = ObjectReader::Need;

std::string quantity_faults(const char* value, Measure measure = Measure::volume) {
  const std::string text = std::string("{\"v\": ") + value + "}";
  Reading reading(text.c_str());
  auto reader = reading.reader();
  EXPECT_FALSE(reader.quantity_value("v", measure, Need::required, {}) && reading.faults.empty());
  reader.finish();
  return reading.faults.text();
}

TEST(ObjectReader, BadFitsAreFaults) {
  EXPECT_EQ(quantity_faults(R"({"value": "600 m3", "fit": ["700 m3", "900 m3"]})"),
            "c.json /v/fit (line 1): the value 600 m3; a fit starts inside its bounds, here 700 to "
            "900 m3. Widen the bounds or move the value.\n");
  EXPECT_EQ(quantity_faults(R"({"value": "600 m3", "fit": ["900 m3", "100 m3"]})"),
            "c.json /v/fit (line 1): [\"900 m3\", \"100 m3\"]; the low end comes first and is "
            "smaller. Swap the two.\n");
  EXPECT_EQ(quantity_faults(R"({"value": "600 m3", "fit": "900 m3"})"),
            "c.json /v/fit (line 1): \"900 m3\"; a range is a list of two quantities. Write it "
            "like [\"100 m3\", \"1500 m3\"].\n");
  EXPECT_EQ(quantity_faults(R"({"fit": ["1 m3", "2 m3"]})"),
            "c.json /v (line 1): no \"value\"; a free quantity has a value. Write {\"value\": .., "
            "\"fit\": [.., ..]}.\n");
  EXPECT_EQ(quantity_faults(R"({"value": "1 m3", "fitt": ["0 m3", "2 m3"]})"),
            "c.json /v/fitt (line 1): key \"fitt\"; this key is not known here. Did you mean "
            "\"fit\"?\n");
}

TEST(ObjectReader, BadSpreadsAreFaults) {
  EXPECT_EQ(quantity_faults(R"({"value": "6 m3", "spread": {"normal": "-1 m3"}})"),
            "c.json /v/spread/normal (line 1): \"-1 m3\"; a volume must be > 0 here.\n");
  EXPECT_EQ(quantity_faults(R"({"value": "6 m3", "spread": {"normal": 1}})"),
            "c.json /v/spread/normal (line 1): 1; a volume needs its unit. Write \"1 m3\" (or m3, "
            "L, gal, MG, ft3).\n");
  EXPECT_EQ(quantity_faults(R"({"value": "6 m3", "spread": {"normal": "1 m3", "lognormal": 0.2}})"),
            "c.json /v/spread (line 1): 2 kinds of spread; a spread has one kind. Write "
            "{\"normal\": ..}, {\"lognormal\": ..}, {\"uniform\": [..]} or {\"triangular\": "
            "[..]}.\n");
  EXPECT_EQ(quantity_faults(R"({"value": "6 m3", "spread": {"norml": "1 m3"}})"),
            "c.json /v/spread/norml (line 1): key \"norml\"; this key is not known here. Did you "
            "mean \"normal\"?\n");
  EXPECT_EQ(quantity_faults(R"({"value": "6 m3", "spread": {"uniform": ["9 m3", "3 m3"]}})"),
            "c.json /v/spread/uniform (line 1): [\"9 m3\", \"3 m3\"]; the low end comes first and "
            "is smaller. Swap the two.\n");
  EXPECT_EQ(quantity_faults(R"({"value": "6 m3", "spread": {"triangular": ["7 m3", "9 m3"]}})"),
            "c.json /v/spread/triangular (line 1): a value outside the range; a triangle peaks at "
            "the value. Widen the range or move the value.\n");
  EXPECT_EQ(quantity_faults(R"({"value": "0 m3", "spread": {"lognormal": 0.2}})"),
            "c.json /v/spread/lognormal (line 1): a value of 0; a lognormal spread needs a value > "
            "0. Use \"normal\".\n");
  EXPECT_EQ(quantity_faults(R"({"value": "6 m3", "spread": "1 m3"})"),
            "c.json /v/spread (line 1): \"1 m3\"; an object {..} belongs here. Write its keys "
            "between { and }.\n");
}

TEST(ObjectReader, FreeQuantitiesDoNotNest) {
  Reading reading(R"({"v": {"value": {"value": "1 m3"}},
    "w": {"value": "1 m3", "spread": {"normal": {"value": "1 m3"}}}})");
  auto reader = reading.reader();
  (void)reader.quantity_value("v", Measure::volume, Need::required, {});
  (void)reader.quantity_value("w", Measure::volume, Need::required, {});
  EXPECT_EQ(reading.faults.text(),
            "c.json /v/value (line 1): an object; a volume is a text with number and unit. Write "
            "it like \"1 m3\".\n"
            "c.json /w/spread/normal (line 2): an object; a volume is a text with number and unit. "
            "Write it like \"1 m3\".\n");
  ASSERT_EQ(reading.free_quantities.size(), 1U);
  EXPECT_EQ(reading.free_quantities[0].pointer, "/w");
}

TEST(ObjectReader, SpreadsOfTemperaturesAreDifferencesAndRangesAreTemperatures) {
  Reading reading(R"({"a": {"value": "35 degC", "spread": {"normal": "2 degC"}},
    "b": {"value": "95 degF", "spread": {"uniform": ["30 degC", "40 degC"]},
          "fit": ["86 degF", "104 degF"]}})");
  auto reader = reading.reader();
  EXPECT_NEAR(reader.quantity_value("a", Measure::temperature, Need::required, {}).value(), 308.15,
              1e-12);
  (void)reader.quantity_value("b", Measure::temperature, Need::required, {});
  reader.finish();
  EXPECT_EQ(reading.faults.text(), "");
  ASSERT_EQ(reading.free_quantities.size(), 2U);
  EXPECT_DOUBLE_EQ(reading.free_quantities[0].spread.value().a, 2.0);
  EXPECT_NEAR(reading.free_quantities[1].spread.value().a, 303.15, 1e-12);
  EXPECT_NEAR(reading.free_quantities[1].fit_high.value(), 313.15, 1e-10);
}

TEST(ObjectReader, EverySpreadIsKept) {
  Reading reading(R"({"l": {"value": "5 d", "spread": {"lognormal": "20 %"}},
    "t": {"value": "5 d", "spread": {"triangular": ["96 h", "7 d"]}}, "s": {"value": 0.3}})");
  auto reader = reading.reader();
  (void)reader.quantity_value("l", Measure::duration, Need::required, {});
  (void)reader.quantity_value("t", Measure::duration, Need::required, {});
  (void)reader.quantity_value("s", Measure::share, Need::required, {});
  EXPECT_EQ(reading.faults.text(), "");
  ASSERT_EQ(reading.free_quantities.size(), 3U);
  EXPECT_EQ(reading.free_quantities[0].spread.value().kind, Spread::Kind::lognormal);
  EXPECT_DOUBLE_EQ(reading.free_quantities[0].spread.value().a, 0.2);
  EXPECT_EQ(reading.free_quantities[1].spread.value().kind, Spread::Kind::triangular);
  EXPECT_DOUBLE_EQ(reading.free_quantities[1].spread.value().a, 4.0);
  EXPECT_DOUBLE_EQ(reading.free_quantities[1].spread.value().b, 7.0);
  EXPECT_FALSE(reading.free_quantities[2].spread.has_value());
}

TEST(ObjectReader, WrongKindsAreNamed) {
  Reading reading(R"({"t": 5, "f": "yes", "n": "5", "i": 2.5, "u": 18446744073709551615,
    "w": "steddy", "o": [], "m": 3, "e": {}})");
  auto reader = reading.reader();
  const std::vector<std::string> words = {"steady", "periodic", "dynamic"};
  (void)reader.text("t", Need::required);
  (void)reader.flag("f", Need::required);
  (void)reader.number("n", Need::required);
  (void)reader.integer("i", Need::required);
  (void)reader.integer("u", Need::required);
  (void)reader.word("w", words, Need::required);
  (void)reader.object("o", Need::required);
  reader.each_member("m", Need::required, [](const auto&, const auto&, const auto&) {});
  reader.each_element("e", Need::required, [](const auto&, const auto&) {});
  reader.finish();
  EXPECT_EQ(reading.faults.text(),
            "c.json /t (line 1): 5; a text belongs here. Put it in quotes.\n"
            "c.json /f (line 1): \"yes\"; true or false belongs here. Write it without quotes.\n"
            "c.json /n (line 1): \"5\"; a bare number belongs here. Write it without quotes and "
            "unit.\n"
            "c.json /i (line 1): 2.5; a whole number belongs here. Write it without quotes and "
            "point.\n"
            "c.json /u (line 1): 18446744073709551615; a whole number belongs here. Write it "
            "without quotes and point.\n"
            "c.json /w (line 2): \"steddy\"; \"steady\", \"periodic\" or \"dynamic\" belongs here. "
            "Did you mean \"steady\"?\n"
            "c.json /o (line 2): a list; an object {..} belongs here. Write its keys between { and "
            "}.\n"
            "c.json /m (line 2): 3; an object of named entries {\"name\": ..} belongs here. Write "
            "its entries between { and }.\n"
            "c.json /e (line 2): an object; a list [..] belongs here. Write its entries between [ "
            "and ].\n");
}

TEST(ObjectReader, OptionalKeysMayBeAbsent) {
  Reading reading("{}");
  auto reader = reading.reader();
  EXPECT_FALSE(reader.text("t", Need::optional));
  EXPECT_FALSE(reader.number("n", Need::optional));
  EXPECT_FALSE(reader.object("o", Need::optional));
  reader.finish();
  EXPECT_TRUE(reading.faults.empty());
}

TEST(ObjectReader, ALongTextIsCutInMessages) {
  EXPECT_EQ(shown(Json(std::string(100, 'x'))), "\"" + std::string(59, 'x') + "...");
  EXPECT_EQ(shown(Json::array({1, 2})), "a list");
  EXPECT_EQ(shown(Json(nullptr)), "null");
}

}  // namespace
}  // namespace stillzone::core
