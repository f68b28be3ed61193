#include <fmt/format.h>

#include <algorithm>
#include <array>
#include <optional>
#include <utility>

#include "core/near_name.hpp"
#include "kinetics/model_closing.hpp"
#include "kinetics/model_reader.hpp"

namespace stillzone::kinetics {

namespace {

using Need = core::ObjectReader::Need;

constexpr std::array<Balance, 4> kBalances{Balance::cod, Balance::carbon, Balance::nitrogen,
                                           Balance::charge};

/// The balance that "closes C" names; empty when the text is no closing at all, an empty balance
/// when it is one we do not know.
struct ClosingText {
  bool is_closing = false;
  std::optional<Balance> balance;
};

ClosingText closing_of(const core::Json& node) {
  ClosingText result;
  if (!node.is_string()) return result;
  const auto text = node.get<std::string>();
  constexpr std::string_view kWord = "closes ";
  result.is_closing = text.starts_with(kWord) || text == "closes";
  for (const Balance balance : kBalances) {
    if (text == std::string(kWord) + std::string(balance_name(balance))) result.balance = balance;
  }
  return result;
}

}  // namespace

void ModelReader::read_processes() {
  for (const auto& [name, place] : processes_) read_process(name, *place.first, place.second);
}

void ModelReader::read_process(const std::string& name, const core::Json& node,
                               const std::string& pointer) {
  core::ObjectReader reader(context_, node, pointer);
  Process process;
  process.name = name;
  process.rate = program_->graph.constant(0.0);
  if (node.is_object()) {
    process.meaning = reader.text("meaning", Need::optional).value_or("");
    if (const auto rate = reader.text("rate", Need::required)) {
      process.rate_text = *rate;
      process.rate = names_->parse(*rate, reader.pointer_to("rate")).value_or(process.rate);
    }
    read_stoichiometry(reader, process);
  }
  reader.finish();
  program_->processes.push_back(std::move(process));
}

void ModelReader::read_stoichiometry(core::ObjectReader& reader, Process& process) {
  std::vector<std::pair<std::size_t, NodeId>> given;
  std::vector<Closing> closings;
  std::vector<std::string> closing_pointers;
  std::vector<std::string> given_texts;
  const auto visit = [&](const std::string& name, const core::Json& node,
                         const std::string& pointer) {
    const auto component = names_->find(name, ModelNames::Kind::component);
    if (!component) {
      fault(pointer, fmt::format("component \"{}\"", name), "the model has no such component",
            core::name_hint(name, names_->names(ModelNames::Kind::component)));
      return;
    }
    const ClosingText closing = closing_of(node);
    if (!closing.is_closing) {
      const auto coefficient = names_->number_or_expression(node, pointer);
      if (!coefficient) return;
      const std::string text = node.is_string() ? node.get<std::string>() : node.dump();
      const bool fits = check_inputs(
          *coefficient, pointer, text,
          [&](std::size_t input) { return input == program_->input_temperature(); },
          "a coefficient may depend on parameters and T only");
      if (!fits) return;
      given.emplace_back(*component, *coefficient);
      given_texts.push_back(text);
      return;
    }
    if (!closing.balance) {
      fault(pointer, core::shown(node),
            "\"closes COD\", \"closes C\", \"closes N\" and \"closes charge\" are allowed", "");
      return;
    }
    const Balance balance = *closing.balance;
    const bool is_second = std::ranges::any_of(
        closings, [&](const Closing& other) { return other.balance == balance; });
    if (is_second) {
      fault(
          pointer, core::shown(node),
          fmt::format("another component of this process already closes {}", balance_name(balance)),
          "Give one of the two a coefficient.");
      return;
    }
    if (!(std::abs(content_of(model_.components[*component].content, balance)) > 0.0)) {
      fault(pointer, core::shown(node),
            fmt::format("\"{}\" holds no {}, so it cannot close that balance", name,
                        balance_name(balance)),
            fmt::format("Give its content under /components/{}/holds/{}, or let another component "
                        "close the balance.",
                        name, balance_name(balance)));
      return;
    }
    closings.push_back({*component, balance});
    closing_pointers.push_back(pointer);
  };
  reader.each_member("stoichiometry", Need::required, visit);
  const auto closed = close_balances(given, closings, model_.components, program_->graph);
  if (const auto* at_fault = std::get_if<std::size_t>(&closed)) {
    fault(closing_pointers[*at_fault], "closings that depend on each other",
          "the components that close balances must differ in what they hold",
          "Give one of them a coefficient.");
    return;
  }
  for (std::size_t i = 0; i < given.size(); ++i) {
    process.stoichiometry.push_back(given[i]);
    process.stoichiometry_text.push_back(given_texts[i]);
  }
  const auto& coefficients = std::get<std::vector<NodeId>>(closed);
  for (std::size_t k = 0; k < closings.size(); ++k) {
    process.stoichiometry.emplace_back(closings[k].component, coefficients[k]);
    process.stoichiometry_text.push_back(
        fmt::format("closes {}", balance_name(closings[k].balance)));
  }
  if (process.stoichiometry.empty() && given.empty() && closing_pointers.empty()) {
    const core::Json* node = reader.raw("stoichiometry");
    if (node != nullptr && node->is_object() && node->empty()) {
      reader.fault("stoichiometry", "no component", "a process changes at least one component", "");
    }
  }
}

}  // namespace stillzone::kinetics
