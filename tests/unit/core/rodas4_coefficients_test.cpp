#include "core/dae/rodas4_coefficients.hpp"

#include <gtest/gtest.h>

#include <Eigen/Dense>

namespace stillzone::core {
namespace {

// The method in its standard form (Hairer and Wanner, Solving ODEs II, 2nd ed. 1996, Section IV.7):
//   k_i = h f(y0 + sum alpha_ij k_j) + h J sum gamma_ij k_j,  y1 = y0 + sum b_i k_i.
// From the transformed coefficients: Gamma = (I / gamma - C)^-1, alpha = A Gamma, b = m^T Gamma.
struct StandardForm {
  Eigen::MatrixXd alpha, gamma, beta;
  Eigen::VectorXd b;
};

Eigen::MatrixXd matrix(const rodas4::Lower& lower) {
  Eigen::MatrixXd result(rodas4::kStages, rodas4::kStages);
  for (int i = 0; i < rodas4::kStages; ++i) {
    for (int j = 0; j < rodas4::kStages; ++j) {
      result(i, j) = lower[static_cast<std::size_t>(i)][static_cast<std::size_t>(j)];
    }
  }
  return result;
}

StandardForm standard_form(const rodas4::Weights& m) {
  StandardForm form;
  const Eigen::MatrixXd identity = Eigen::MatrixXd::Identity(rodas4::kStages, rodas4::kStages);
  form.gamma = (identity / rodas4::kGamma - matrix(rodas4::kC)).inverse();
  form.alpha = matrix(rodas4::kA) * form.gamma;
  form.beta = form.alpha + form.gamma;
  form.b = form.gamma.transpose() * Eigen::Map<const Eigen::VectorXd>(m.data(), rodas4::kStages);
  return form;
}

// The printed coefficients carry 16 digits and grow to 35: sums of their products keep about 1e-13.
constexpr double kPrinted = 1e-12;

// Order conditions: ibid., Section IV.7, Table 7.1 with (7.15').
void expect_order_3(const StandardForm& f) {
  const Eigen::VectorXd one = Eigen::VectorXd::Ones(rodas4::kStages);
  const Eigen::VectorXd alpha = f.alpha * one;
  const Eigen::VectorXd beta = f.beta * one;
  EXPECT_NEAR(f.b.sum(), 1.0, kPrinted);
  EXPECT_NEAR(f.b.dot(beta), 1.0 / 2.0, kPrinted);
  EXPECT_NEAR(f.b.dot(alpha.cwiseProduct(alpha)), 1.0 / 3.0, kPrinted);
  EXPECT_NEAR(f.b.dot(f.beta * beta), 1.0 / 6.0, kPrinted);
}

TEST(Rodas4Coefficients, MeetTheOrderConditionsUpToFour) {
  const StandardForm f = standard_form(rodas4::kM);
  expect_order_3(f);
  const Eigen::VectorXd one = Eigen::VectorXd::Ones(rodas4::kStages);
  const Eigen::VectorXd alpha = f.alpha * one;
  const Eigen::VectorXd beta = f.beta * one;
  const Eigen::VectorXd alpha2 = alpha.cwiseProduct(alpha);
  EXPECT_NEAR(f.b.dot(alpha2.cwiseProduct(alpha)), 1.0 / 4.0, kPrinted);
  EXPECT_NEAR(f.b.dot(alpha.cwiseProduct(f.alpha * beta)), 1.0 / 8.0, kPrinted);
  EXPECT_NEAR(f.b.dot(f.beta * alpha2), 1.0 / 12.0, kPrinted);
  EXPECT_NEAR(f.b.dot(f.beta * (f.beta * beta)), 1.0 / 24.0, kPrinted);
}

TEST(Rodas4Coefficients, EmbeddedSolutionHasOrderThree) {
  rodas4::Weights embedded = rodas4::kM;
  embedded[5] = 0.0;
  expect_order_3(standard_form(embedded));
}

// Stiff accuracy (ibid., Section VI.4): the last row of beta is b, the diagonal is gamma.
TEST(Rodas4Coefficients, AreStifflyAccurate) {
  const StandardForm f = standard_form(rodas4::kM);
  for (int j = 0; j < rodas4::kStages; ++j) EXPECT_NEAR(f.beta(5, j), f.b(j), kPrinted);
}

// For index 1 (ibid., Section VI.4, eq. (4.12)): with omega = beta^-1, order 3 of the algebraic
// part needs sum b_i omega_ij alpha_j^2 = 1, and order 4 of a stiffly accurate method besides
// sum b_i alpha_i omega_il alpha_l^2 alpha_... : sum b_i alpha_i (alpha omega alpha^2)_i = 1/4.
TEST(Rodas4Coefficients, MeetTheOrderConditionsOfIndexOne) {
  const StandardForm f = standard_form(rodas4::kM);
  const Eigen::VectorXd alpha = f.alpha * Eigen::VectorXd::Ones(rodas4::kStages);
  const Eigen::VectorXd alpha2 = alpha.cwiseProduct(alpha);
  const Eigen::VectorXd omega_alpha2 = f.beta.inverse() * alpha2;
  EXPECT_NEAR(f.b.dot(omega_alpha2), 1.0, 1e-11);
  EXPECT_NEAR(f.b.dot(alpha.cwiseProduct(f.alpha * omega_alpha2)), 1.0 / 4.0, 1e-11);
}

TEST(Rodas4Coefficients, StabilityFunctionVanishesAtInfinity) {
  const StandardForm f = standard_form(rodas4::kM);
  const Eigen::VectorXd one = Eigen::VectorXd::Ones(rodas4::kStages);
  EXPECT_NEAR(1.0 - f.b.dot(f.beta.inverse() * one), 0.0, 1e-11);
}

// Quadratures see the method as weights on g and on G u: for constant g they add h g.
TEST(Rodas4Coefficients, QuadratureWeightsSumToTheirStandardForm) {
  const rodas4::Weights w = rodas4::quadrature_weights(rodas4::kM);
  const StandardForm f = standard_form(rodas4::kM);
  double sum = 0.0;
  for (int i = 0; i < rodas4::kStages; ++i) {
    EXPECT_NEAR(w[static_cast<std::size_t>(i)], f.b(i), kPrinted);
    sum += w[static_cast<std::size_t>(i)];
  }
  EXPECT_NEAR(sum, 1.0, kPrinted);
}

}  // namespace
}  // namespace stillzone::core
