#include "core/output_folder.hpp"

#include <gtest/gtest.h>

#include <fstream>
#include <sstream>

namespace stillzone::core {
namespace {

namespace fs = std::filesystem;

class OutputFolders : public testing::Test {
 protected:
  void SetUp() override {
    base_ =
        fs::temp_directory_path() /
        ("stillzone-" + std::string(testing::UnitTest::GetInstance()->current_test_info()->name()));
    fs::remove_all(base_);
    fs::create_directory(base_);
  }
  void TearDown() override { fs::remove_all(base_); }
  std::string content(const char* file) {
    std::ifstream in(base_ / file);
    std::ostringstream text;
    text << in.rdbuf();
    return text.str();
  }
  std::size_t n_entries() {
    return static_cast<std::size_t>(
        std::distance(fs::directory_iterator(base_), fs::directory_iterator()));
  }
  fs::path base_;
};

TEST_F(OutputFolders, AppearOnlyAtCommitAndReplaceTheOldWhole) {
  for (const char* text : {"one", "two"}) {
    auto folder = OutputFolder::create(base_ / "a.out");
    ASSERT_TRUE(folder.ok());
    ASSERT_TRUE(folder.value().write(text, text).ok());
    ASSERT_TRUE(folder.value().commit().ok());
  }
  EXPECT_EQ(content("a.out/two"), "two");
  EXPECT_FALSE(fs::exists(base_ / "a.out/one"));
  EXPECT_EQ(n_entries(), 1U);
}

TEST_F(OutputFolders, LeaveNothingWithoutCommit) {
  {
    auto folder = OutputFolder::create(base_ / "a.out");
    ASSERT_TRUE(folder.ok());
    ASSERT_TRUE(folder.value().write("x", "x").ok());
  }
  EXPECT_EQ(n_entries(), 0U);
}

TEST_F(OutputFolders, NeverReplaceWhatIsNotOurs) {
  fs::create_directory(base_ / "precious");
  std::ofstream(base_ / "precious/data") << "1";
  const auto folder = OutputFolder::create(base_ / "precious");
  ASSERT_FALSE(folder.ok());
  EXPECT_NE(folder.failure().text().find("exists and was not written by stillzone"),
            std::string::npos);
  EXPECT_TRUE(fs::exists(base_ / "precious/data"));
}

TEST_F(OutputFolders, NeedAnExistingParent) {
  const auto folder = OutputFolder::create(base_ / "no/such/a.out");
  ASSERT_FALSE(folder.ok());
  EXPECT_NE(folder.failure().text().find("does not exist"), std::string::npos);
}

TEST_F(OutputFolders, WhatComesMeanwhileIsNotReplaced) {
  auto folder = OutputFolder::create(base_ / "a.out");
  ASSERT_TRUE(folder.ok());
  fs::create_directory(base_ / "a.out");
  std::ofstream(base_ / "a.out/data") << "1";
  const auto done = folder.value().commit();
  ASSERT_FALSE(done.ok());
  EXPECT_NE(done.failure().text().find("exists and was not written by stillzone"),
            std::string::npos);
  EXPECT_EQ(content("a.out/data"), "1");
}

TEST_F(OutputFolders, AFileInTheWayIsNotReplaced) {
  std::ofstream(base_ / "a.out") << "1";
  EXPECT_FALSE(OutputFolder::create(base_ / "a.out").ok());
  EXPECT_EQ(content("a.out"), "1");
}

TEST_F(OutputFolders, AnEmptyFolderMayBeFilled) {
  fs::create_directory(base_ / "a.out");
  auto folder = OutputFolder::create(base_ / "a.out/");
  ASSERT_TRUE(folder.ok());
  ASSERT_TRUE(folder.value().write("x", "1").ok());
  ASSERT_TRUE(folder.value().commit().ok());
  EXPECT_EQ(content("a.out/x"), "1");
}

TEST_F(OutputFolders, AParentThatTakesNoFolderIsAFailureWithANextStep) {
  const auto folder = OutputFolder::create("/proc/a.out");
  ASSERT_FALSE(folder.ok());
  EXPECT_NE(folder.failure().text().find("cannot create /proc/"), std::string::npos);
  EXPECT_NE(folder.failure().text().find("Give another folder with --out"), std::string::npos);
}

TEST_F(OutputFolders, CannotBeCommittedTwice) {
  auto folder = OutputFolder::create(base_ / "a.out");
  ASSERT_TRUE(folder.ok());
  ASSERT_TRUE(folder.value().commit().ok());
  EXPECT_THROW((void)folder.value().commit(), std::exception);
}

}  // namespace
}  // namespace stillzone::core
