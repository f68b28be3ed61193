#include "network/joint_spread.hpp"

#include <fmt/format.h>

#include <Eigen/Dense>
#include <algorithm>
#include <cmath>

#include "core/near_name.hpp"

namespace stillzone::network {
namespace {

using core::ObjectReader;
using Need = ObjectReader::Need;

void read_quantities(ObjectReader& reader, const std::vector<core::FreeQuantity>& free,
                     JointSpread& joint) {
  std::vector<std::string> known;
  for (const core::FreeQuantity& quantity : free) {
    if (quantity.spread && quantity.spread->kind == core::Spread::Kind::normal) {
      known.push_back(quantity.pointer);
    }
  }
  reader.each_element(
      "quantities", Need::required, [&](const core::Json& node, const std::string& /*pointer*/) {
        const std::string name = node.is_string() ? node.get<std::string>() : "";
        if (std::ranges::find(known, name) == known.end()) {
          reader.fault("quantities", core::shown(node),
                       "each is the JSON pointer of a quantity of this case that "
                       "carries \"spread\": {\"normal\": ..}",
                       core::name_hint(name, known));
        } else if (std::ranges::find(joint.quantities, name) != joint.quantities.end()) {
          reader.fault("quantities", core::shown(node), "each stands once",
                       "Take one of them out, with its row and column.");
        }
        joint.quantities.push_back(name);
      });
}

void read_matrix(ObjectReader& reader, JointSpread& joint) {
  const std::size_t n = joint.quantities.size();
  std::size_t n_rows = 0;
  bool numbers = true;
  reader.each_element(
      "correlation", Need::required, [&](const core::Json& row, const std::string& /*pointer*/) {
        ++n_rows;
        numbers = numbers && row.is_array() && row.size() == n;
        if (!row.is_array()) return;
        for (const core::Json& entry : row) {
          numbers = numbers && entry.is_number();
          joint.correlation.push_back(entry.is_number() ? entry.get<double>() : 0.0);
        }
      });
  if (n_rows != n || !numbers || n < 2) {
    reader.fault("correlation", fmt::format("{} rows for {} quantities", n_rows, n),
                 "a square matrix of numbers, one row and one column per quantity, at least two",
                 "Write for two quantities [[1, 0.3], [0.3, 1]].");
    return;
  }
  const auto size = static_cast<Eigen::Index>(n);
  const Eigen::Map<const Eigen::Matrix<double, -1, -1, Eigen::RowMajor>> matrix(
      joint.correlation.data(), size, size);
  const bool symmetric = (matrix - matrix.transpose()).cwiseAbs().maxCoeff() < 1e-9;
  const bool ones = (matrix.diagonal().array() - 1.0).abs().maxCoeff() < 1e-9;
  if (!symmetric || !ones || matrix.cwiseAbs().maxCoeff() > 1.0 + 1e-9) {
    reader.fault("correlation", "a matrix that is no correlation matrix",
                 "1 on the diagonal, the same on both sides of it, nothing beyond -1 to 1",
                 "Correct the entries.");
    return;
  }
  const double least =
      Eigen::SelfAdjointEigenSolver<Eigen::MatrixXd>(matrix, Eigen::EigenvaluesOnly)
          .eigenvalues()
          .minCoeff();
  if (least < -1e-6) {
    reader.fault("correlation", fmt::format("an eigenvalue of {:.3g}", least),
                 "no quantities can be correlated so: no eigenvalue lies below 0",
                 "Take the matrix from one fit as a whole.");
  }
}

}  // namespace

std::optional<JointSpread> read_joint_spread(core::ObjectReader& root,
                                             const std::vector<core::FreeQuantity>& free) {
  auto reader = root.object("joint_spread", Need::optional);
  if (!reader) return std::nullopt;
  JointSpread joint;
  read_quantities(*reader, free, joint);
  read_matrix(*reader, joint);
  reader->finish();
  return joint;
}

}  // namespace stillzone::network
