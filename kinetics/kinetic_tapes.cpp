#include "kinetics/kinetic_tapes.hpp"

#include <algorithm>

namespace stillzone::kinetics {

namespace {

using Op = ExpressionGraph::Op;

/// A model's expressions rebuilt so that work on fixed values can be taken out: x / f becomes
/// x * (1 / f) where f is fixed.
class FixedPart {
 public:
  FixedPart(const ModelProgram& program) : program_(program), copy_(program.graph.size(), kNone) {}

  ExpressionGraph graph;

  NodeId copy(NodeId root) {
    mark_needed(root);
    for (std::size_t i = 0; i <= root.value(); ++i) {
      if (needed_[i] && copy_[i] == kNone) copy_[i] = copy_node(program_.graph.node(NodeId(i)));
    }
    return copy_[root.value()];
  }
  std::vector<NodeId> copy(const std::vector<NodeId>& roots) {
    std::vector<NodeId> copies;
    copies.reserve(roots.size());
    for (const NodeId root : roots) copies.push_back(copy(root));
    return copies;
  }

  /// Depends on T, kLa or T_gas and on nothing else.
  bool is_fixed(NodeId id) {
    classify();
    return kind_[id.value()] == Kind::fixed;
  }

 private:
  enum class Kind : std::uint8_t { constant, fixed, free };
  static constexpr NodeId kNone{static_cast<std::size_t>(-1)};

  void mark_needed(NodeId root) {
    needed_.assign(root.value() + 1, false);
    needed_[root.value()] = true;
    for (std::size_t i = root.value() + 1; i-- > 0;) {
      if (!needed_[i] || copy_[i] != kNone) continue;
      const ExpressionGraph::Node& n = program_.graph.node(NodeId(i));
      const int operands = ExpressionGraph::n_operands(n.op);
      if (operands >= 1) needed_[n.a.value()] = true;
      if (operands == 2) needed_[n.b.value()] = true;
    }
  }

  NodeId copy_node(const ExpressionGraph::Node& n) {
    const int operands = ExpressionGraph::n_operands(n.op);
    const NodeId a = operands >= 1 ? copy_[n.a.value()] : NodeId();
    const NodeId b = operands == 2 ? copy_[n.b.value()] : NodeId();
    if (n.op == Op::divide && is_fixed(b)) {
      return graph.multiply(a, graph.divide(graph.constant(1.0), b));
    }
    return graph.rebuild(n, a, b);
  }

  /// Brings kind_ up to the size of the graph.
  void classify() {
    for (std::size_t i = kind_.size(); i < graph.size(); ++i) {
      const ExpressionGraph::Node& n = graph.node(NodeId(i));
      const int operands = ExpressionGraph::n_operands(n.op);
      Kind kind = Kind::constant;
      if (n.op == Op::input) {
        kind = n.a.value() >= program_.input_temperature() ? Kind::fixed : Kind::free;
      }
      if (operands >= 1) kind = std::max(kind, kind_[n.a.value()]);
      if (operands == 2) kind = std::max(kind, kind_[n.b.value()]);
      kind_.push_back(kind);
    }
  }

  const ModelProgram& program_;
  std::vector<NodeId> copy_;  ///< by node of the program
  std::vector<bool> needed_;
  std::vector<Kind> kind_;  ///< by node of the new graph
};

/// Adds places of consecutive offsets.
void append(std::vector<TapePlace>& places, const std::vector<NodeId>& nodes, std::uint16_t array,
            std::size_t first_offset) {
  for (std::size_t i = 0; i < nodes.size(); ++i) {
    places.push_back({nodes[i], array, first_offset + i});
  }
}

/// Collects the largest fixed subexpressions that the given roots need, in order of first use.
class FixedFrontier {
 public:
  explicit FixedFrontier(FixedPart& part) : part_(part) {}

  std::vector<NodeId> nodes;

  void add(const std::vector<TapePlace>& roots) {
    seen_.resize(part_.graph.size(), false);
    for (const TapePlace& root : roots) add(root.node);
  }

 private:
  void add(NodeId root) {
    std::vector<NodeId> open{root};
    while (!open.empty()) {
      const NodeId next = open.back();
      open.pop_back();
      if (seen_[next.value()]) continue;
      seen_[next.value()] = true;
      if (part_.is_fixed(next)) {
        nodes.push_back(next);
        continue;
      }
      const ExpressionGraph::Node& n = part_.graph.node(next);
      const int operands = ExpressionGraph::n_operands(n.op);
      if (operands == 2) open.push_back(n.b);
      if (operands >= 1) open.push_back(n.a);
    }
  }

  FixedPart& part_;
  std::vector<bool> seen_;
};

/// Roots of every tape but the fixed one, in the order of KineticTapes::Which.
using RootLists = std::vector<std::vector<TapePlace>>;

std::vector<TapePlace> jacobian_roots(ExpressionGraph& graph, const ModelProgram& program,
                                      const std::vector<NodeId>& rows,
                                      std::vector<KineticEntry>& pattern) {
  std::vector<TapePlace> roots;
  for (std::size_t row = 0; row < rows.size(); ++row) {
    for (const std::size_t column : graph.inputs_of(rows[row])) {
      if (column >= program.input_temperature()) continue;
      const NodeId entry = graph.derivative(rows[row], column);
      if (entry == graph.constant(0.0)) continue;
      roots.push_back({entry, 0, pattern.size()});
      pattern.push_back({row, column});
    }
  }
  return roots;
}

std::vector<TapePlace> implicit_roots(ExpressionGraph& graph, const ModelProgram& program,
                                      const std::vector<NodeId>& implicit) {
  std::vector<TapePlace> roots;
  append(roots, implicit, 0, 0);
  for (const NodeId residual : implicit) {
    for (std::size_t j = 0; j < implicit.size(); ++j) {
      const std::size_t offset = roots.size() - implicit.size();
      roots.push_back({graph.derivative(residual, program.n_components + j), 1, offset});
    }
  }
  return roots;
}

RootLists all_roots(FixedPart& part, const ModelProgram& program,
                    std::vector<KineticEntry>& pattern) {
  std::vector<NodeId> rows = part.copy(program.source);
  const std::vector<NodeId> implicit = part.copy(program.implicit);
  const std::vector<NodeId> transfer = part.copy(program.transfer);
  rows.insert(rows.end(), implicit.begin(), implicit.end());
  RootLists lists(5);
  append(lists[0], rows, 0, 0);
  append(lists[0], transfer, 1, 0);
  rows.insert(rows.end(), transfer.begin(), transfer.end());
  lists[1] = jacobian_roots(part.graph, program, rows, pattern);
  lists[2] = implicit_roots(part.graph, program, implicit);
  std::vector<NodeId> process_rates;
  for (const Process& process : program.processes) process_rates.push_back(part.copy(process.rate));
  append(lists[3], process_rates, 0, 0);
  append(lists[4], part.copy(program.derived), 0, 0);
  return lists;
}

}  // namespace

KineticTapes::KineticTapes(const ModelProgram& program) {
  FixedPart part(program);
  const RootLists lists = all_roots(part, program, pattern);

  FixedFrontier frontier(part);
  for (const std::vector<TapePlace>& roots : lists) frontier.add(roots);
  n_fixed = frontier.nodes.size();

  std::vector<TapePlace> conditions;
  for (std::size_t i = 0; i < 3; ++i) {
    conditions.push_back({part.graph.input(program.input_temperature() + i), 0, i});
  }
  std::vector<TapePlace> leaves;
  const std::size_t n_unknowns = program.n_components + program.n_implicits;
  for (std::size_t i = 0; i < n_unknowns; ++i) {
    leaves.push_back({part.graph.input(i), kUnknowns, i});
  }
  for (std::size_t g = 0; g < program.n_gases; ++g) {
    leaves.push_back({part.graph.input(n_unknowns + g), kGases, g});
  }
  std::vector<TapePlace> fixed_values;
  append(fixed_values, frontier.nodes, 0, 0);
  append(leaves, frontier.nodes, kFixed, 0);

  tapes.emplace_back(part.graph, conditions, fixed_values);
  for (const std::vector<TapePlace>& roots : lists) tapes.emplace_back(part.graph, leaves, roots);
}

std::size_t KineticTapes::scratch_lines() const {
  std::size_t lines = 0;
  for (const Tape& tape : tapes) lines = std::max(lines, tape.scratch_lines());
  return lines;
}

}  // namespace stillzone::kinetics
