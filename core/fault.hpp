#pragma once

#include <string>
#include <string_view>
#include <utility>
#include <vector>

namespace stillzone::core {

/// One thing that is wrong with an input file, in the four parts every message of ours has:
/// the place, what was found, what is allowed, and the next step.
struct Fault {
  std::string file = {};  ///< as the user named it; empty for a command-line value
  std::string pointer =
      {};             ///< JSON pointer (RFC 6901), or "row 12, column li" for a CSV; may be empty
  int line = 0;       ///< counted from 1; 0 when not known
  int character = 0;  ///< within the text at that place, from 1 (an expression); 0: the whole of it
  std::string found = {};    ///< what stands there, quoted: "\"-120 m3/d\"", "key \"volum\""
  std::string allowed = {};  ///< what may stand there, a clause without full stop
  std::string way_out = {};  ///< the next step, a sentence with full stop; may be empty

  /// `north.json /flows/3/flow (line 41): "-120 m3/d"; a one-way flow must be >= 0. Swap ...`
  [[nodiscard]] std::string text() const;
};

/// The faults of one reading, collected so that all of a file are shown at once.
class FaultList {
 public:
  void add(Fault fault) { faults_.push_back(std::move(fault)); }
  [[nodiscard]] bool empty() const { return faults_.empty(); }
  [[nodiscard]] const std::vector<Fault>& all() const { return faults_; }
  /// One line per fault, each ending in a newline.
  [[nodiscard]] std::string text() const;

 private:
  std::vector<Fault> faults_;
};

}  // namespace stillzone::core
