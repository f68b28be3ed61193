#include "tests/unit/network/network_cases_support.hpp"

namespace stillzone::testing {

const char* const kSludge =
    R"({ "X_ch": 5.0, "X_pr": 20.0, "X_li": 5.0, "X_I": 25.0, "X_c": 2.0, "S_ac": 0.1,
         "S_IN": 0.01, "S_IC": 0.04, "S_cat": 0.04, "S_an": 0.02 })";

std::string every_flow_case(const std::string& kinetics, const std::string& feed_state,
                            const std::string& run) {
  return R"({ "stillzone": "case/1", "title": "every kind of flow", "temperature": "35 degC",
  "kinetics": )" +
         kinetics + R"(,
  "zones": {
    "inlet": { "volume": "400 m3", "gas": { "to": "dome", "kLa": "200 1/d" } },
    "core":  { "volume": "1800 m3", "gas": { "to": "dome", "kLa": "120 1/d" } },
    "floor": { "volume": "700 m3" },
    "top":   { "volume": "300 m3", "temperature": "33 degC", "gas": { "to": "bell", "kLa": "300 1/d" } },
    "shaft": { "volume": "50 m3", "gas": { "to": "bell", "kLa": "40 1/d" } }
  },
  "headspaces": {
    "dome": { "volume": "250 m3", "pipe": { "coefficient": "5e4 m3/d/bar", "back_pressure": "1.013 bar" } },
    "bell": { "volume": "60 m3", "temperature": "30 degC",
              "pipe": { "coefficient": "2e4 m3/d/bar", "back_pressure": "1.013 bar", "opening_pressure": "0.01 bar" } }
  },
  "feeds": {
    "sludge": { "flow": "150 m3/d", "schedule": "pulses", "state": )" +
         feed_state + R"( },
    "scum":   { "flow": "20 m3/d", "state": )" +
         feed_state + R"( }
  },
  "outlets": ["overflow", "bottom"],
  "schedules": {
    "mixing": { "every": "1 h", "on_for": "12 min", "idle": 0.05 },
    "pulses": { "every": "1 d", "on_for": "6 h", "first_on": "2 h" }
  },
  "flows": [
    { "from": "sludge", "to": "inlet", "share": 0.8 },
    { "from": "sludge", "to": "overflow", "share": 0.05 },
    { "from": "sludge", "to": "core" },
    { "from": "scum", "to": "top" },
    { "from": "inlet", "to": "core" },
    { "from": "core", "to": "shaft", "flow": "900 m3/d" },
    { "from": "shaft", "to": "inlet" },
    { "from": "core", "to": "top" },
    { "from": "top", "to": "bottom", "share": 0.3 },
    { "from": "top", "to": "overflow" },
    { "between": ["core", "floor"], "flow": "90 m3/d" },
    { "between": ["core", "top"], "flow": "2500 m3/d", "schedule": "mixing" }
  ],
  "run": )" +
         run + " }";
}

std::string one_tank_case(const std::string& feed_extra, const std::string& schedules,
                          const std::string& run) {
  return R"({ "stillzone": "case/1", "title": "one tank", "temperature": "35 degC", "kinetics": "adm1",
  "zones": { "tank": { "volume": "3400 m3", "gas": { "to": "dome", "kLa": "200 1/d" } } },
  "headspaces": { "dome": { "volume": "300 m3",
    "pipe": { "coefficient": "5e4 m3/d/bar", "back_pressure": "1.013 bar" } } },
  "feeds": { "sludge": { "flow": "170 m3/d", "state": )" +
         std::string(kSludge) + feed_extra + R"( } },
  "outlets": ["overflow"],
  "schedules": )" +
         schedules + R"(,
  "flows": [ { "from": "sludge", "to": "tank" }, { "from": "tank", "to": "overflow" } ],
  "run": )" +
         run + " }";
}

}  // namespace stillzone::testing
