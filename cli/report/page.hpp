#pragma once

#include <string>
#include <string_view>
#include <vector>

namespace stillzone::cli {

/// Text as it may stand in HTML and in quoted attributes: & < > " ' replaced, control characters
/// that no HTML may hold dropped.
[[nodiscard]] std::string html_escaped(std::string_view text);

/// A number as people read it: `digits` significant ones, no exponent between 1e-4 and 1e6, a true
/// minus sign, "n/a" when it is not finite.
[[nodiscard]] std::string shown(double value, int digits = 4);

/// The same without trailing zeros, for sentences and drawings.
[[nodiscard]] std::string brief(double value, int digits = 4);

/// A table of a report; the numbers stand right, the first column left.
struct HtmlTable {
  std::string caption;
  std::vector<std::string> head;               ///< plain text, one per column
  std::vector<std::vector<std::string>> rows;  ///< plain text
  std::vector<bool> left;                      ///< columns of words; the first always is
};
[[nodiscard]] std::string html_of(const HtmlTable& table);

/// Rows as CSV (RFC 4180), header first.
[[nodiscard]] std::string csv_of(const std::vector<std::string>& head,
                                 const std::vector<std::vector<std::string>>& rows);

/// A figure: drawing, caption, and its numbers as a CSV file one click away.
/// @param name file name of the CSV, without ending; also the figure's anchor
/// @param caption HTML
[[nodiscard]] std::string html_figure(const std::string& name, const std::string& svg,
                                      const std::string& caption, const std::string& csv);

/// Collects the sections of a page, with a table of contents.
class Page {
 public:
  /// @param kind what the page reports, "Run", "Tracer test"; @param title of the case
  Page(std::string kind, std::string title) : kind_(std::move(kind)), title_(std::move(title)) {}
  /// A section with its heading. @param body HTML
  void add(const std::string& anchor, const std::string& heading, const std::string& body);
  /// The whole document, with style and script. @param foot HTML, closes every page
  [[nodiscard]] std::string html(const std::string& foot) const;

 private:
  std::string kind_;
  std::string title_;
  std::string contents_;
  std::string body_;
};

}  // namespace stillzone::cli
