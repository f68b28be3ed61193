#pragma once

#include <string>
#include <utility>
#include <variant>

#include "core/require.hpp"

namespace stillzone::core {

/// Why a computation ended without a result (exit code 3), in words for the user.
struct Failure {
  std::string reason = {};    ///< what went wrong, with the number and the limit it broke
  double time_d = 0.0;        ///< [d] model time at the failure; 0 when time plays no part
  std::string place = {};     ///< zone or headspace at fault; may be empty
  std::string quantity = {};  ///< component at fault; may be empty
  std::string got_done = {};  ///< what was reached before; may be empty
  std::string try_this = {};  ///< the next step, a sentence

  [[nodiscard]] std::string text() const;
};

/// A value, or the Failure that stood in its way. Dropping one does not build.
template <class T>
class [[nodiscard]] Result {
 public:
  Result(T value) : content_(std::move(value)) {}            // NOLINT(google-explicit-constructor)
  Result(Failure failure) : content_(std::move(failure)) {}  // NOLINT(google-explicit-constructor)

  [[nodiscard]] bool ok() const { return std::holds_alternative<T>(content_); }
  explicit operator bool() const { return ok(); }
  [[nodiscard]] T& value() & {
    SZ_REQUIRE(ok(), "{}", failure().text());
    return std::get<T>(content_);
  }
  [[nodiscard]] const T& value() const& {
    SZ_REQUIRE(ok(), "{}", failure().text());
    return std::get<T>(content_);
  }
  [[nodiscard]] T&& value() && {
    SZ_REQUIRE(ok(), "{}", failure().text());
    return std::get<T>(std::move(content_));
  }
  [[nodiscard]] const Failure& failure() const { return std::get<Failure>(content_); }

 private:
  std::variant<T, Failure> content_;
};

/// For computations that return nothing but may fail.
struct Done {};

}  // namespace stillzone::core
