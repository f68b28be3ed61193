#include "core/json_document.hpp"

#include <gtest/gtest.h>

#include <chrono>
#include <filesystem>
#include <fstream>

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
  EXPECT_NE(faults_of("{\"a\" 1}").find("c.json (line 1): this is not JSON"), std::string::npos);
}

TEST(JsonDocument, NamesAllDuplicatesAtOnce) {
  EXPECT_EQ(faults_of("{\"a\": {\"x\": 1,\n\"x\": 2},\n\"\\u0061\": 3}"),
            "c.json /a/x (line 2): key \"x\" for the second time; each key stands once; the first "
            "is on line 1. Take one of the two out.\n"
            "c.json /a (line 3): key \"a\" for the second time; each key stands once; the first is "
            "on line 1. Take one of the two out.\n");
}

TEST(JsonDocument, KeysThatDifferInAnEscapeAreTwoKeys) {
  const auto d = document("{\"n\": 1,\n\"\\n\": 2,\n\"\\uD83D\\uDE00\": 3}");
  EXPECT_EQ(d.root().size(), 3U);
  EXPECT_EQ(d.line_of("/\xF0\x9F\x98\x80"), 3);
}

TEST(JsonDocument, NumbersAreFinite) {
  for (const std::string number : {"1e999", "-1e999", "NaN", "Infinity", "-Infinity"}) {
    EXPECT_EQ(faults_of("{\n\"a\": " + number + "}"),
              "c.json /a (line 2): " + number +
                  "; a number must be finite. Give a number between -1e308 and 1e308.\n");
  }
  EXPECT_EQ(document("{\"a\": 1e-999}").root()["a"].get<double>(), 0.0);
}

TEST(JsonDocument, ByteOrderMarksAreReadOrNamed) {
  EXPECT_EQ(document("\xEF\xBB\xBF{\"a\": 1}").root()["a"], 1);
  EXPECT_EQ(faults_of("\xFF\xFE{"),
            "c.json (line 1): a UTF-16 file; input files are UTF-8 text. Save it again as "
            "UTF-8.\n");
}

TEST(JsonDocument, WrongUtf8IsAFaultWithItsLine) {
  EXPECT_NE(faults_of("{\n\"a\": \"\xC3(\"}").find("c.json (line 2): this is not JSON"),
            std::string::npos);
}

TEST(JsonDocument, BrokenEndsNeverHang) {
  const std::string whole = R"({"a": [1, "b\u0041", {"c": /* x */ -1.5e3}], // d
    "e": true})";
  for (std::size_t n = 1; n < whole.size(); ++n) {
    EXPECT_NE(faults_of(whole.substr(0, n)), "") << n;
  }
}

TEST(JsonDocument, EndlessKeysAndDeepPointersCostNoMemory) {
  EXPECT_EQ(faults_of("{\"" + std::string(300, 'k') + "\": 1}"),
            "c.json (line 1): a key of 300 characters; a key has at most 200. Check the quotes.\n");
  std::string deep;
  for (int i = 0; i < 60; ++i) deep += "{\"" + std::string(200, 'k') + "\":\n";
  const auto d = document(deep + "[1,\n2]" + std::string(60, '}'));
  std::string pointer;
  for (int i = 0; i < 60; ++i) pointer += "/" + std::string(200, 'k');
  EXPECT_EQ(d.line_of(pointer + "/1"), 4);  // of the nearest parent with at most 1000 characters
}

TEST(JsonDocument, LargeFilesTakeLinearTime) {
  std::string text = "[";
  for (int i = 0; i < 200000; ++i) text += "{\"flow\": \"170 m3/d\"},\n";
  text += "0]";
  const auto start = std::chrono::steady_clock::now();
  const auto d = document(text);
  const std::chrono::duration<double> spent = std::chrono::steady_clock::now() - start;
  EXPECT_EQ(d.line_of("/199999/flow"), 200000);
  EXPECT_LT(spent.count(), 20.0);  // [s]; a quadratic scan takes hours; 1 s here
}

TEST(JsonDocument, MissingFilesAndFoldersAreFaults) {
  const auto text = [](const std::filesystem::path& path) {
    FaultList faults;
    EXPECT_FALSE(JsonDocument::read(path, faults).has_value());
    return faults.text();
  };
  EXPECT_EQ(text("no_such.json"),
            "no_such.json: there is no such file; an input file must exist. Check the name and the "
            "folder you are in.\n");
  EXPECT_EQ(text("/tmp"),
            "/tmp: this is a folder; an input file is needed. Check the name and the folder you "
            "are in.\n");
  EXPECT_NE(text("/dev/zero").find("the file is larger than 64 MiB"), std::string::npos);
}

TEST(JsonDocument, SetUnderstandsPointerEscapesAndIndices) {
  auto d = document(R"({"a/b": {"m~n": 1}, "list": [1, {"x": 2}]})");
  FaultList faults;
  d.set("/a~1b/m~0n=5", faults);
  d.set("/list/1/x=\"7\"", faults);
  d.set("/list/0=null", faults);
  EXPECT_TRUE(faults.empty()) << faults.text();
  EXPECT_EQ(d.root()["a/b"]["m~n"], 5);
  EXPECT_EQ(d.root()["list"][1]["x"], "7");
  EXPECT_TRUE(d.root()["list"][0].is_null());
  EXPECT_EQ(d.line_of("/list/1/x"), 0);
  d.set("/list/01x/y=3", faults);
  d.set("/list/0/y=3", faults);
  d.set("/a~1b/x=\xC3(", faults);
  EXPECT_EQ(faults.text(),
            "--set /list/01x/y=3: \"01x\" after \"/list\"; a list of 2 entries is counted from 0. "
            "Give the number of an entry.\n"
            "--set /list/0/y=3: no \"y\" in \"/list/0\"; there is nothing below a single value. "
            "Shorten the pointer.\n"
            "--set: bytes that are no UTF-8; a setting is UTF-8 text. Check the terminal's "
            "encoding.\n");
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

}  // namespace
}  // namespace stillzone::core
