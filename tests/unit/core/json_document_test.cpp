#include "core/json_document.hpp"

#include <gtest/gtest.h>

#include "core/json_reader.hpp"

namespace stillzone::core {
namespace {

std::string faults_of(std::string_view text) {
  FaultList faults;
  EXPECT_FALSE(JsonDocument::parse(text, "c.json", ".", faults).has_value());
  return faults.text();
}
JsonDocument document(std::string_view text) {
  FaultList faults;
  auto result = JsonDocument::parse(text, "c.json", ".", faults);
  EXPECT_TRUE(result.has_value()) << faults.text();
  return std::move(result).value();
}

TEST(JsonDocument, KnowsTheLineOfEveryNode) {
  const auto d = document("// a case\n{\n  \"zones\": {\n    \"a/b\": [1,\n 2] }\n}\n");
  EXPECT_EQ(d.line_of(""), 2);
  EXPECT_EQ(d.line_of("/zones"), 3);
  EXPECT_EQ(d.line_of("/zones/a~1b"), 4);
  EXPECT_EQ(d.line_of("/zones/a~1b/1"), 5);
  EXPECT_EQ(d.line_of("/zones/missing/deep"), 3);
}

TEST(JsonDocument, RefusesDuplicateKeysTrailingCommasAndDeepNesting) {
  EXPECT_EQ(faults_of("{\"a\": 1,\n \"a\": 2}"),
            "c.json /a (line 2): key \"a\" for the second time; each key stands once; the first is "
            "on line 1. Take one of the two out.\n");
  EXPECT_EQ(faults_of("{\"a\": [1, 2,\n]}"),
            "c.json /a/1 (line 1): a comma before the closing \"]\"; the last entry has no comma "
            "after it. Take the comma in column 12 out.\n");
  EXPECT_NE(faults_of(std::string(70, '[') + std::string(70, ']')).find("nesting deeper than 64"),
            std::string::npos);
  EXPECT_EQ(faults_of("  \n"),
            "c.json: the file is empty; an input file is one JSON object. `stillzone schema` shows "
            "what belongs in it.\n");
  EXPECT_NE(faults_of("{\"a\": 1e999}").find("c.json"), std::string::npos);
  EXPECT_NE(faults_of("{\"a\" 1}").find("c.json (line 1): this is not JSON"), std::string::npos);
}

TEST(JsonDocument, SetChangesOneValue) {
  auto d = document(R"({"zones": {"core": {"volume": "1 m3"}}, "flows": [{"flow": "2 m3/d"}]})");
  FaultList faults;
  d.set("/zones/core/volume=900 m3", faults);
  d.set("/flows/0/share=0.5", faults);
  d.set("/run={\"kind\": \"steady\"}", faults);
  EXPECT_TRUE(faults.empty()) << faults.text();
  EXPECT_EQ(d.root()["zones"]["core"]["volume"], "900 m3");
  EXPECT_EQ(d.root()["flows"][0]["share"], 0.5);
  EXPECT_EQ(d.root()["run"]["kind"], "steady");
}

TEST(JsonDocument, SetRefusesWhatIsNotThere) {
  auto d = document(R"({"zones": {"core": {"volume": "1 m3"}}, "flows": [1]})");
  const auto text = [&](const char* setting) {
    FaultList faults;
    d.set(setting, faults);
    return faults.text();
  };
  EXPECT_EQ(text("/zones/cor/volume=2 m3"),
            "--set /zones/cor/volume=2 m3: no \"cor\" in \"/zones\"; a setting changes or adds one "
            "value in what is there. Did you mean \"core\"?\n");
  EXPECT_EQ(text("/flows/3=2"),
            "--set /flows/3=2: \"3\" after \"/flows\"; a list of 1 entries is counted from 0. Give "
            "the number of an entry.\n");
  EXPECT_EQ(text("zones=1"),
            "--set zones=1: no \"/pointer=value\"; a setting is a JSON pointer, \"=\" and a value. "
            "Write for example --set \"/zones/core/volume=900 m3\".\n");
}

class Reading {
 public:
  explicit Reading(const char* text) : document_(document(text)) {}
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

}  // namespace
}  // namespace stillzone::core
