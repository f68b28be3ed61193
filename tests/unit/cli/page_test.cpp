#include "cli/report/page.hpp"

#include <gmock/gmock.h>
#include <gtest/gtest.h>

#include <limits>

#include "cli/report/sha256.hpp"

namespace stillzone::cli {
namespace {

using ::testing::HasSubstr;
using ::testing::Not;

TEST(HtmlText, IsEscaped) {
  EXPECT_EQ(html_escaped("<a href=\"x\">&'\x01\n"), "&lt;a href=&quot;x&quot;&gt;&amp;&#39;\n");
}

TEST(ShownNumber, HasTheDigitsAskedFor) {
  EXPECT_EQ(shown(2955.71), "2956");
  EXPECT_EQ(shown(0.19163, 3), "0.192");
  EXPECT_EQ(shown(-1.5e-9, 2), "\u22121.5e-09");
  EXPECT_EQ(shown(0.0), "0");
  EXPECT_EQ(shown(std::numeric_limits<double>::infinity()), "n/a");
  EXPECT_EQ(brief(170.0), "170");
  EXPECT_EQ(brief(0.250), "0.25");
}

TEST(Csv, QuotesWhatNeedsIt) {
  EXPECT_EQ(csv_of({"a,b", "c"}, {{"say \"x\"", "1"}}), "\"a,b\",c\r\n\"say \"\"x\"\"\",1\r\n");
}

TEST(HtmlFigure, OffersItsNumbersAsAFile) {
  const std::string html = html_figure("f", "<svg></svg>", "caption", "a,b\r\n1,\"2%\"\r\n");
  EXPECT_THAT(html, HasSubstr("download=\"f.csv\""));
  EXPECT_THAT(html, HasSubstr("data:text/csv;charset=utf-8,a,b%0D%0A1,%222%25%22%0D%0A\""));
}

TEST(Page, NamesNoAddressOfAnyNetwork) {
  Page page("Run report", "A <title>");
  page.add("x", "Heading", "<p>text</p>");
  const std::string html = page.html("");
  EXPECT_THAT(html, HasSubstr("<title>A &lt;title&gt;: Run report</title>"));
  EXPECT_THAT(html, Not(HasSubstr("https:")));
  EXPECT_THAT(html, Not(HasSubstr("src=")));
  EXPECT_THAT(html, Not(HasSubstr("url(")));
}

// FIPS PUB 180-4 example messages as published by NIST (Cryptographic Standards, examples with
// intermediate values, SHA256): one block "abc", two blocks "abcdbcde..."; the empty message is
// checked against the common tools.
TEST(Sha256, GivesThePublishedDigests) {
  EXPECT_EQ(sha256_hex("abc"), "ba7816bf8f01cfea414140de5dae2223b00361a396177a9cb410ff61f20015ad");
  EXPECT_EQ(sha256_hex("abcdbcdecdefdefgefghfghighijhijkijkljklmklmnlmnomnopnopq"),
            "248d6a61d20638b8e5c026930c3e6039a33ce45964ff2167f6ecedd419db06c1");
  EXPECT_EQ(sha256_hex(""), "e3b0c44298fc1c149afbf4c8996fb92427ae41e4649b934ca495991b7852b855");
}

}  // namespace
}  // namespace stillzone::cli
