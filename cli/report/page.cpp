#include "cli/report/page.hpp"

#include <fmt/format.h>

#include <cmath>

#include "cli/report/page_look.hpp"

namespace stillzone::cli {

namespace {

/// Text as the data part of a "data:" address inside a quoted attribute.
std::string address_encoded(std::string_view text) {
  std::string encoded;
  for (const char c : text) {
    const auto byte = static_cast<unsigned char>(c);
    const bool plain = std::string_view("-_.~,;:/()*+=@!").find(c) != std::string_view::npos ||
                       (byte < 128 && std::isalnum(byte) != 0);
    if (plain) {
      encoded += c;
    } else {
      encoded += fmt::format("%{:02X}", byte);
    }
  }
  return encoded;
}

std::string csv_cell(const std::string& cell) {
  if (cell.find_first_of(",\"\r\n") == std::string::npos) return cell;
  std::string quoted = "\"";
  for (const char c : cell) {
    if (c == '"') quoted += '"';
    quoted += c;
  }
  return quoted + '"';
}

void add_csv_line(std::string& csv, const std::vector<std::string>& cells) {
  for (std::size_t i = 0; i < cells.size(); ++i) {
    if (i > 0) csv += ',';
    csv += csv_cell(cells[i]);
  }
  csv += "\r\n";
}

}  // namespace

std::string html_escaped(std::string_view text) {
  std::string escaped;
  escaped.reserve(text.size());
  for (const char c : text) {
    switch (c) {
      case '&':
        escaped += "&amp;";
        break;
      case '<':
        escaped += "&lt;";
        break;
      case '>':
        escaped += "&gt;";
        break;
      case '"':
        escaped += "&quot;";
        break;
      case '\'':
        escaped += "&#39;";
        break;
      default:
        if (static_cast<unsigned char>(c) >= 32 || c == '\n' || c == '\t') escaped += c;
    }
  }
  return escaped;
}

std::string shown(double value, int digits) {
  if (!std::isfinite(value)) return "n/a";
  const double size = std::fabs(value);
  if (size < 1e-300) return "0";
  std::string text;
  if (size < 1e-4 || size >= 1e6) {
    text = fmt::format("{:.{}e}", size, digits - 1);
  } else {
    const int before = static_cast<int>(std::floor(std::log10(size))) + 1;
    text = fmt::format("{:.{}f}", size, std::max(0, digits - before));
  }
  return (value < 0.0 ? "\u2212" : "") + text;
}

std::string brief(double value, int digits) {
  std::string text = shown(value, digits);
  if (text.find('.') == std::string::npos || text.find('e') != std::string::npos) return text;
  while (text.back() == '0') text.pop_back();
  if (text.back() == '.') text.pop_back();
  return text;
}

std::string html_of(const HtmlTable& table) {
  const auto word = [&](std::size_t column) {
    return column < table.left.size() && table.left[column] ? " class=w" : "";
  };
  std::string html = "<div class=scroll><table>";
  if (!table.caption.empty()) html += "<caption>" + html_escaped(table.caption) + "</caption>";
  html += "<thead><tr>";
  for (std::size_t i = 0; i < table.head.size(); ++i) {
    html += fmt::format("<th scope=col{}>{}</th>", word(i), html_escaped(table.head[i]));
  }
  html += "</tr></thead><tbody>";
  for (const auto& row : table.rows) {
    html += "<tr>";
    for (std::size_t i = 0; i < row.size(); ++i) {
      html += i == 0 ? fmt::format("<th scope=row>{}</th>", html_escaped(row[i]))
                     : fmt::format("<td{}>{}</td>", word(i), html_escaped(row[i]));
    }
    html += "</tr>";
  }
  return html + "</tbody></table></div>\n";
}

std::string csv_of(const std::vector<std::string>& head,
                   const std::vector<std::vector<std::string>>& rows) {
  std::string csv;
  add_csv_line(csv, head);
  for (const auto& row : rows) add_csv_line(csv, row);
  return csv;
}

std::string html_figure(const std::string& name, const std::string& svg, const std::string& caption,
                        const std::string& csv) {
  const std::string id = html_escaped(name);
  return fmt::format(
      "<figure class=\"{}\" id=\"fig-{}\">{}<figcaption>{} <a class=csv download=\"{}.csv\" "
      "href=\"data:text/csv;charset=utf-8,{}\">Numbers as CSV</a></figcaption></figure>\n",
      svg.find("class=\"net") != std::string::npos ? "net" : "chart", id, svg, caption, id,
      address_encoded(csv));
}

void Page::add(const std::string& anchor, const std::string& heading, const std::string& body) {
  contents_ += fmt::format("<a href=\"#{}\">{}</a>\n", anchor, html_escaped(heading));
  body_ += fmt::format("<section id=\"{}\"><h2>{}</h2>\n{}</section>\n", anchor,
                       html_escaped(heading), body);
}

std::string Page::html(const std::string& foot) const {
  const std::string title = html_escaped(title_.empty() ? "Untitled" : title_);
  std::string html = "<!DOCTYPE html>\n<html lang=en>\n<head>\n<meta charset=utf-8>\n";
  html +=
      "<meta name=viewport content=\"width=device-width,initial-scale=1\">\n"
      "<meta http-equiv=Content-Security-Policy content=\"default-src 'none';style-src "
      "'unsafe-inline';script-src 'unsafe-inline';img-src data:\">\n"
      "<meta name=color-scheme content=\"light dark\">\n<link rel=icon href=\"data:,\">\n";
  html += fmt::format("<title>{}: {}</title>\n<style>{}</style>\n</head>\n<body>\n", title,
                      html_escaped(kind_), page_style());
  html += fmt::format("<header><p>Stillzone &middot; {}</p><h1>{}</h1></header>\n",
                      html_escaped(kind_), title);
  html += fmt::format("<nav aria-label=Contents>{}</nav>\n<main>\n{}</main>\n", contents_, body_);
  return html + foot + fmt::format("<script>{}</script>\n</body>\n</html>\n", page_script());
}

}  // namespace stillzone::cli
