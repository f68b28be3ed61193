#include "core/csv_table.hpp"

#include <gtest/gtest.h>

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

TEST(CsvCell, QuotesOnlyWhereNeeded) {
  EXPECT_EQ(csv_cell("core.S_ac"), "core.S_ac");
  EXPECT_EQ(csv_cell("a,\"b\""), "\"a,\"\"b\"\"\"");
  EXPECT_EQ(csv_number(0.1), "0.1");
  EXPECT_EQ(csv_number(1e-20), "1e-20");
}

}  // namespace
}  // namespace stillzone::core
