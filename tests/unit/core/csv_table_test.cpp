#include "core/csv_table.hpp"

#include <gtest/gtest.h>

#include <algorithm>
#include <chrono>

namespace stillzone::core {
namespace {

CsvTable table(std::string_view text) {
  FaultList faults;
  auto result = CsvTable::parse(text, "t.csv", faults);
  EXPECT_TRUE(result.has_value()) << faults.text();
  return result.value();
}
std::string faults_of(std::string_view text) {
  FaultList faults;
  EXPECT_FALSE(CsvTable::parse(text, "t.csv", faults).has_value());
  return faults.text();
}
double number(const CsvTable& t, std::size_t row, std::size_t column) {
  FaultList faults;
  const auto value = t.number(row, column, faults);
  EXPECT_TRUE(value.has_value()) << faults.text();
  return value.value_or(-1e300);
}

TEST(CsvTable, ReadsCommasSemicolonsAndTabs) {
  for (const char* text : {"a,b\n1.5,2\n", "a;b\n1,5;2\n", "a\tb\n1,5\t2\n", "a;b\r\n1.5;2\r\n"}) {
    const CsvTable t = table(text);
    EXPECT_EQ(t.header(), (std::vector<std::string>{"a", "b"}));
    EXPECT_DOUBLE_EQ(number(t, 0, 0), 1.5) << text;
    EXPECT_DOUBLE_EQ(number(t, 0, 1), 2.0) << text;
  }
}

TEST(CsvTable, PassesOverByteOrderMarkCommentsAndBlankLines) {
  const CsvTable t = table("\xEF\xBB\xBF# exported\n\nday,li\n0,1\n,,\n\n2,3\n");
  EXPECT_EQ(t.header().front(), "day");
  ASSERT_EQ(t.n_rows(), 2U);
  EXPECT_EQ(t.line(0), 4);
  EXPECT_EQ(t.line(1), 7);
}

TEST(CsvTable, AFirstLineMayStateTheSeparator) {
  const CsvTable t = table("\xEF\xBB\xBFsep=;\r\na,x;b\r\n1,5;2\r\n");
  EXPECT_EQ(t.header(), (std::vector<std::string>{"a,x", "b"}));
  EXPECT_DOUBLE_EQ(number(t, 0, 0), 1.5);
  EXPECT_EQ(t.line(0), 3);
  EXPECT_EQ(table("sep=x\n1\n").header().front(), "sep=x");
}

TEST(CsvTable, TextThatIsNoUtf8IsTakenAsLatin1) {
  EXPECT_EQ(table("t,li [\xB5g/L]\n1,\xFC\n").header()[1], "li [\xC2\xB5g/L]");
  EXPECT_EQ(table("t,li [\xB5g/L]\n1,\xFC\n").cell(0, 1), "\xC3\xBC");
  // What is UTF-8 already stays: two, three and four bytes.
  const std::string utf8 = "\xC2\xB5 \xE2\x82\xAC \xF0\x9F\x92\xA7";
  EXPECT_EQ(table("a,b\n1," + utf8 + "\n").cell(0, 1), utf8);
  // Overlong, a surrogate, beyond the last code point, cut off: none of them is UTF-8.
  for (const char* wrong :
       {"\xC0\x80", "\xE0\x80\x80", "\xED\xA0\x80", "\xF4\x90\x80\x80", "\xC3"}) {
    EXPECT_NE(table(std::string("a,b\n1,") + wrong).cell(0, 1), wrong);
  }
}

TEST(CsvTable, QuotedCellsKeepSeparatorsQuotesAndLineEnds) {
  const CsvTable t = table("a,b\n\"x, \"\"y\"\"\nz\",2\n");
  EXPECT_EQ(t.cell(0, 0), "x, \"y\"\nz");
  EXPECT_DOUBLE_EQ(number(t, 0, 1), 2.0);
}

TEST(CsvTable, MissingIsNoFault) {
  const CsvTable t = table("a,b\nNA,\n-,nan\n");
  FaultList faults;
  for (std::size_t row : {0U, 1U}) {
    for (std::size_t column : {0U, 1U}) EXPECT_FALSE(t.number(row, column, faults).has_value());
  }
  EXPECT_TRUE(faults.empty());
}

TEST(CsvTable, FaultsNameLineAndColumn) {
  const CsvTable t = table("a,b\n1,2\n3,4 mg\n");
  FaultList faults;
  EXPECT_FALSE(t.number(1, 1, faults).has_value());
  EXPECT_EQ(faults.text(),
            "t.csv column b (line 3): \"4 mg\"; a number belongs here, or nothing where it is "
            "missing. Put units and remarks into the header or another column.\n");
  EXPECT_EQ(faults_of("a,b\n1,2,3\n"),
            "t.csv (line 2): 3 cells; the header names 2 columns. Check for a stray separator or "
            "an unquoted text.\n");
  EXPECT_EQ(faults_of("a,a\n1,2\n"),
            "t.csv (line 1): column \"a\" twice; each column has its own name. Rename one of the "
            "two.\n");
  EXPECT_EQ(faults_of("\n\n"),
            "t.csv: the table is empty; the first row names the columns. Check the export.\n");
  EXPECT_EQ(faults_of("a,b\n"),
            "t.csv: the table has a header and no rows; at least one row is needed. Check the "
            "export.\n");
  EXPECT_EQ(faults_of("\xFF\xFE"
                      "a"),
            "t.csv (line 1): a UTF-16 file; tables are read as UTF-8 text. Export it again as "
            "\"CSV UTF-8\".\n");
}

TEST(CsvTable, RaggedRowsAreFaultsAndOnlyTheFirstAreListed) {
  EXPECT_EQ(faults_of("a,b,c\n1,2\n"),
            "t.csv (line 2): 2 cells; the header names 3 columns. Leave a missing cell empty, but "
            "write its separator.\n");
  std::string text = "a,b\n";
  for (int i = 0; i < 1000; ++i) text += "1\n";
  const std::string faults = faults_of(text);
  EXPECT_EQ(std::count(faults.begin(), faults.end(), '\n'), 6);
  EXPECT_NE(faults.find("t.csv: 995 more rows of the wrong length; every row has the cells the "
                        "header names. Check the separator of the export.\n"),
            std::string::npos);
  EXPECT_EQ(table("a,b\n1,2,,\n").n_rows(), 1U);  // empty cells a spreadsheet adds
}

TEST(CsvTable, QuotesGoneWrongAreFaults) {
  EXPECT_EQ(faults_of("a,b\n1,2\n\"3,4\n5,6\n"),
            "t.csv (line 3): 1 cell; the header names 2 columns. Leave a missing cell empty, but "
            "write its separator.\n"
            "t.csv (line 3): a quote that is never closed; a quoted cell ends with its quote; a "
            "quote inside is doubled. Check the quotes.\n");
  EXPECT_EQ(
      faults_of("a,b\n\"x\"y,2\n"),
      "t.csv (line 2): text after a closing quote; a quoted cell ends with its quote; a quote "
      "inside is doubled. Check the quotes.\n");
}

TEST(CsvTable, CommentsMayHoldAnything) {
  const CsvTable t = table("# it's, \"odd\n#;;;\na,b\n1,2\n# \"\n3,4\n");
  ASSERT_EQ(t.n_rows(), 2U);
  EXPECT_EQ(t.line(1), 6);
}

TEST(CsvTable, LineEndsOfAnyKindCount) {
  const CsvTable t = table("a,b\r1,2\r3,x\r");
  ASSERT_EQ(t.n_rows(), 2U);
  EXPECT_EQ(t.line(1), 3);
}

TEST(CsvTable, ACommaInsideANumberBetweenCommasIsNotGuessed) {
  FaultList faults;
  const auto t = CsvTable::parse("a,b\n1,\"7,6\"\n", "t.csv", faults);
  ASSERT_TRUE(t);
  EXPECT_FALSE(t->number(0, 1, faults));
  EXPECT_EQ(
      faults.text(),
      "t.csv column b (line 2): \"7,6\"; this table has no decimal commas, so a comma may be a "
      "decimal or a thousands mark. Export it again with decimal points, or with semicolons "
      "between the columns.\n");
}

TEST(CsvTable, TwoDecimalMarksAreNotGuessed) {
  const CsvTable t = table("a;b;c\n1,5;1,234;1.234\n2,5;12.5;2\n");
  FaultList faults;
  EXPECT_DOUBLE_EQ(number(t, 0, 0), 1.5);
  EXPECT_FALSE(t.number(0, 1, faults).has_value());
  EXPECT_FALSE(t.number(1, 1, faults).has_value());
  EXPECT_FALSE(t.number(0, 2, faults).has_value());
  EXPECT_EQ(faults.all().size(), 3U);
  EXPECT_EQ(
      faults.all().front().text(),
      "t.csv column b (line 2): \"1,234\"; this table has decimal commas, so a point may be a "
      "decimal or a thousands mark. Export it again with one decimal mark and no thousands "
      "separators.");
  EXPECT_DOUBLE_EQ(number(table("a;b\n1.234;2\n"), 0, 0), 1.234);
  EXPECT_DOUBLE_EQ(number(table("a,b\n1.234,2\n"), 0, 0), 1.234);
}

TEST(CsvTable, BinaryFilesAreRefused) {
  EXPECT_EQ(faults_of(std::string_view("PK\0\0,", 5)),
            "t.csv: bytes that are no text; a table is UTF-8 text with a separator. Export the "
            "sheet as \"CSV UTF-8\".\n");
}

TEST(CsvTable, FilesThatCannotBeReadAreFaults) {
  FaultList faults;
  EXPECT_FALSE(CsvTable::read("no_such.csv", faults));
  EXPECT_FALSE(CsvTable::read("/tmp", faults));
  EXPECT_EQ(faults.text(),
            "no_such.csv: there is no such file; a table must exist and be readable. Paths in an "
            "input file start at that file's folder.\n"
            "/tmp: this is a folder; a table must exist and be readable. Paths in an input file "
            "start at that file's folder.\n");
}

TEST(CsvTable, LargeTablesAreReadInSeconds) {
  std::string text = "t;q;li\n";
  while (text.size() < (std::size_t{50} << 20U)) text += "12,345678;1,7025e2;0,0123\n";
  const auto start = std::chrono::steady_clock::now();
  const CsvTable t = table(text);
  double sum = 0.0;
  for (std::size_t i = 0; i < t.n_rows(); ++i) sum += number(t, i, 1);
  const std::chrono::duration<double> spent = std::chrono::steady_clock::now() - start;
  EXPECT_NEAR(sum / static_cast<double>(t.n_rows()), 170.25, 1e-6);
  RecordProperty("seconds", std::to_string(spent.count()));
  EXPECT_LT(spent.count(), 30.0);
}

TEST(CsvNumber, ReadsBackToTheSameDouble) {
  for (const double x : {0.1, 1.0 / 3.0, 1e300, -5e-324, 123456789.123456789}) {
    EXPECT_DOUBLE_EQ(number(table("a\n" + csv_number(x) + "\n"), 0, 0), x);
  }
}

TEST(CsvCell, QuotesOnlyWhereNeeded) {
  EXPECT_EQ(csv_cell("core.S_ac"), "core.S_ac");
  EXPECT_EQ(csv_cell("a,\"b\""), "\"a,\"\"b\"\"\"");
  EXPECT_EQ(csv_number(0.1), "0.1");
  EXPECT_EQ(csv_number(1e-20), "1e-20");
}

}  // namespace
}  // namespace stillzone::core
