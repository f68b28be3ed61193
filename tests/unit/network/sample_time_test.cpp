#include "network/tracer/sample_time.hpp"

#include <gtest/gtest.h>

namespace stillzone::network {
namespace {

constexpr DateOrder kYear = DateOrder::year_first;
constexpr DateOrder kDay = DateOrder::day_first;
constexpr DateOrder kMonth = DateOrder::month_first;
// 2026-03-02 is 20514 days after 1970-01-01: 56 years of 365 days, 14 leap days, 31 + 28 + 1 days.
constexpr double kSecondOfMarch = 56 * 365 + 14 + 60;

TEST(SampleTime, ThreeOrdersOfOneDay) {
  EXPECT_DOUBLE_EQ(*read_date_time("2026-03-02", kYear), kSecondOfMarch);
  EXPECT_DOUBLE_EQ(*read_date_time("02.03.2026", kDay), kSecondOfMarch);
  EXPECT_DOUBLE_EQ(*read_date_time("2/3/2026", kDay), kSecondOfMarch);
  EXPECT_DOUBLE_EQ(*read_date_time("3/2/2026", kMonth), kSecondOfMarch);
  EXPECT_DOUBLE_EQ(*read_date_time("2026/03/02", kYear), kSecondOfMarch);
}

TEST(SampleTime, TimesOfDay) {
  EXPECT_DOUBLE_EQ(*read_date_time("2026-03-02 14:30", kYear), kSecondOfMarch + 14.5 / 24.0);
  EXPECT_DOUBLE_EQ(*read_date_time("2026-03-02T06:00:00", kYear), kSecondOfMarch + 0.25);
  EXPECT_NEAR(*read_date_time("2026-03-02 00:00:08.64", kYear), kSecondOfMarch + 1e-4, 1e-11);
  EXPECT_DOUBLE_EQ(*read_date_time("2026-03-02 24:00", kYear), kSecondOfMarch + 1.0);
  EXPECT_DOUBLE_EQ(*read_date_time(" 2026-03-02 12:00 ", kYear), kSecondOfMarch + 0.5);
}

TEST(SampleTime, TwelveHourClock) {
  EXPECT_DOUBLE_EQ(*read_date_time("3/2/2026 2:30 PM", kMonth), kSecondOfMarch + 14.5 / 24.0);
  EXPECT_DOUBLE_EQ(*read_date_time("3/2/2026 12:00 am", kMonth), kSecondOfMarch);
  EXPECT_DOUBLE_EQ(*read_date_time("3/2/2026 12:00PM", kMonth), kSecondOfMarch + 0.5);
  EXPECT_FALSE(read_date_time("3/2/2026 14:30 PM", kMonth));
  EXPECT_FALSE(read_date_time("3/2/2026 0:30 AM", kMonth));
  EXPECT_FALSE(read_date_time("3/2/2026 PM", kMonth));
}

TEST(SampleTime, LeapDaysExistInLeapYearsOnly) {
  EXPECT_DOUBLE_EQ(*read_date_time("2024-03-01", kYear) - *read_date_time("2024-02-29", kYear),
                   1.0);
  EXPECT_FALSE(read_date_time("2026-02-29", kYear));
  EXPECT_FALSE(read_date_time("2026-04-31", kYear));
}

TEST(SampleTime, WhatIsNoTimeIsRefused) {
  for (const char* text : {"",
                           " ",
                           "-",
                           "yesterday",
                           "2026-03",
                           "2026-03-02 14",
                           "2026-03-02 24:01",
                           "2026-03-02 14:60",
                           "2026-03-02 14:30.15",
                           "2026-03/02",
                           "2026 03 02",
                           "2026-03-02-14:30",
                           "26-03-02",
                           "2026-13-02",
                           "2026-00-02",
                           "2026-03-00",
                           "2026-265-02",
                           "2026-03-258",
                           "2026-03-02 14:30:61",
                           "2026-03-02 14:30Z",
                           "2026--3-02",
                           "46083.25",
                           "99999999999-03-02",
                           "2026-03-02 08:00:00.1.2",
                           "-2026-03-02"}) {
    EXPECT_FALSE(read_date_time(text, kYear)) << text;
  }
  EXPECT_FALSE(read_date_time("02.03.2026", kYear));
  EXPECT_FALSE(read_date_time("13/25/2026", kMonth));
}

TEST(SampleTime, NamesOfOrders) {
  for (const DateOrder order : {kYear, kDay, kMonth}) {
    EXPECT_EQ(date_order_of(date_order_name(order)), order);
  }
  EXPECT_FALSE(date_order_of("year"));
}

TEST(SampleTime, SerialDayOfASpreadsheet) {
  // 1970-01-01 is serial 25569 in the 1900 system; 2026-03-02 comes 20514 days later.
  EXPECT_EQ(serial_day(25569.0), "1970-01-01 00:00");
  EXPECT_EQ(serial_day(25569.0 + kSecondOfMarch + 0.25), "2026-03-02 06:00");
  EXPECT_FALSE(serial_day(60.0));
  EXPECT_FALSE(serial_day(1e9));
}

TEST(SampleTime, ARefusedTimeComesWithANextStep) {
  EXPECT_EQ(date_time_way_out("46083.25", kYear),
            "This is a spreadsheet's day number (it stands for 2026-03-02 06:00): give the column "
            "the format yyyy-mm-dd hh:mm and export it again.");
  EXPECT_EQ(date_time_way_out("46083,25", kDay), date_time_way_out("46083.25", kDay));
  EXPECT_EQ(date_time_way_out("3.5", kYear),
            "This is a plain number: give the column a date format and export it again, or use "
            "\"unit\" for elapsed time.");
  EXPECT_EQ(date_time_way_out("25/03/2026", kMonth),
            "It can be read \"day first\": correct \"dates\", or this cell.");
  EXPECT_EQ(date_time_way_out("2026-03-02 14:30Z", kYear),
            "Take the time zone off: all times of a test are one clock.");
  EXPECT_EQ(date_time_way_out("2026-03-02T14:30+01:00", kYear),
            "Take the time zone off: all times of a test are one clock.");
  EXPECT_EQ(date_time_way_out("02.03.26", kDay),
            "Write a time day first with a year of four digits, such as 02.03.2026 14:30.");
}

}  // namespace
}  // namespace stillzone::network
