#include "core/dae/fast_vector.hpp"

#include <gtest/gtest.h>

#include <array>
#include <cmath>
#include <memory>
#include <vector>

namespace stillzone::core {
namespace {

class FastVectorOperations : public testing::Test {
 protected:
  static constexpr std::size_t kN = 11;  // not a multiple of four
  FastVectorOperations() {
    EXPECT_EQ(sundials::create_context(&context_), 0);
    x_ = std::make_unique<FastVector>(kN, context_);
    y_ = std::make_unique<FastVector>(kN, context_);
    z_ = std::make_unique<FastVector>(kN, context_);
    for (std::size_t i = 0; i < kN; ++i) {
      x_->values()[i] = std::sin(static_cast<double>(i) + 0.5);
      y_->values()[i] = std::cos(3.0 * static_cast<double>(i)) + 0.01;
      z_->values()[i] = 7.0;
    }
    copy_x_.assign(x_->values().begin(), x_->values().end());
    copy_y_.assign(y_->values().begin(), y_->values().end());
  }
  ~FastVectorOperations() override {
    x_.reset();
    y_.reset();
    z_.reset();
    SUNContext_Free(&context_);
  }
  SUNContext context_ = nullptr;
  std::unique_ptr<FastVector> x_, y_, z_;
  std::vector<double> copy_x_, copy_y_;
};

TEST_F(FastVectorOperations, OfOneOrTwoVectorsMatchTheirDefinition) {
  N_VLinearSum(2.0, x_->get(), -3.0, y_->get(), z_->get());
  for (std::size_t i = 0; i < kN; ++i) {
    EXPECT_DOUBLE_EQ(z_->values()[i], 2.0 * copy_x_[i] - 3.0 * copy_y_[i]);
  }
  N_VProd(x_->get(), y_->get(), z_->get());
  for (std::size_t i = 0; i < kN; ++i) EXPECT_DOUBLE_EQ(z_->values()[i], copy_x_[i] * copy_y_[i]);
  N_VDiv(x_->get(), y_->get(), z_->get());
  for (std::size_t i = 0; i < kN; ++i) EXPECT_DOUBLE_EQ(z_->values()[i], copy_x_[i] / copy_y_[i]);
  N_VAbs(x_->get(), z_->get());
  for (std::size_t i = 0; i < kN; ++i) EXPECT_DOUBLE_EQ(z_->values()[i], std::abs(copy_x_[i]));
  N_VInv(y_->get(), z_->get());
  for (std::size_t i = 0; i < kN; ++i) EXPECT_DOUBLE_EQ(z_->values()[i], 1.0 / copy_y_[i]);
  N_VAddConst(x_->get(), 0.25, z_->get());
  for (std::size_t i = 0; i < kN; ++i) EXPECT_DOUBLE_EQ(z_->values()[i], copy_x_[i] + 0.25);
  N_VConst(4.0, z_->get());
  for (std::size_t i = 0; i < kN; ++i) EXPECT_DOUBLE_EQ(z_->values()[i], 4.0);
}

TEST_F(FastVectorOperations, WorkInPlace) {
  N_VLinearSum(2.0, x_->get(), 1.0, y_->get(), x_->get());
  for (std::size_t i = 0; i < kN; ++i) {
    EXPECT_DOUBLE_EQ(x_->values()[i], 2.0 * copy_x_[i] + copy_y_[i]);
  }
  N_VScale(-0.5, y_->get(), y_->get());
  for (std::size_t i = 0; i < kN; ++i) EXPECT_DOUBLE_EQ(y_->values()[i], -0.5 * copy_y_[i]);
}

TEST_F(FastVectorOperations, NormsMatchTheirDefinition) {
  double dot = 0.0;
  double sum = 0.0;
  double masked = 0.0;
  double largest = 0.0;
  double least = 1e300;
  for (std::size_t i = 0; i < kN; ++i) {
    dot += copy_x_[i] * copy_y_[i];
    sum += std::pow(copy_x_[i] * copy_y_[i], 2);
    z_->values()[i] = i % 3 == 0 ? 1.0 : 0.0;
    if (i % 3 == 0) masked += std::pow(copy_x_[i] * copy_y_[i], 2);
    largest = std::max(largest, std::abs(copy_x_[i]));
    least = std::min(least, copy_x_[i]);
  }
  EXPECT_NEAR(N_VDotProd(x_->get(), y_->get()), dot, 1e-15);
  EXPECT_NEAR(N_VWrmsNorm(x_->get(), y_->get()), std::sqrt(sum / kN), 1e-15);
  EXPECT_NEAR(N_VWrmsNormMask(x_->get(), y_->get(), z_->get()), std::sqrt(masked / kN), 1e-15);
  EXPECT_DOUBLE_EQ(N_VMaxNorm(x_->get()), largest);
  EXPECT_DOUBLE_EQ(N_VMin(x_->get()), least);
}

TEST_F(FastVectorOperations, OfManyVectorsMatchTheirDefinition) {
  std::array<double, 3> c = {2.0, -1.0, 0.5};
  std::array<N_Vector, 3> in = {x_->get(), y_->get(), z_->get()};
  FastVector out(kN, context_);
  ASSERT_EQ(N_VLinearCombination(3, c.data(), in.data(), out.get()), 0);
  for (std::size_t i = 0; i < kN; ++i) {
    EXPECT_NEAR(out.values()[i], 2.0 * copy_x_[i] - copy_y_[i] + 3.5, 1e-14);
  }
  ASSERT_EQ(N_VLinearCombination(2, c.data(), in.data(), x_->get()), 0);  // into its first term
  for (std::size_t i = 0; i < kN; ++i) {
    EXPECT_NEAR(x_->values()[i], 2.0 * copy_x_[i] - copy_y_[i], 1e-14);
  }
  std::array<N_Vector, 2> y = {y_->get(), z_->get()};
  std::array<double, 2> a = {3.0, 4.0};
  ASSERT_EQ(N_VScaleVectorArray(2, a.data(), y.data(), y.data()), 0);
  for (std::size_t i = 0; i < kN; ++i) {
    EXPECT_DOUBLE_EQ(y_->values()[i], 3.0 * copy_y_[i]);
    EXPECT_DOUBLE_EQ(z_->values()[i], 28.0);
  }
  ASSERT_EQ(N_VScaleAddMulti(2, a.data(), out.get(), y.data(), y.data()), 0);
  for (std::size_t i = 0; i < kN; ++i) {
    EXPECT_NEAR(z_->values()[i], 28.0 + 4.0 * out.values()[i], 1e-13);
  }
}

TEST_F(FastVectorOperations, AreInheritedByClones) {
  N_Vector clone = N_VClone(x_->get());
  EXPECT_EQ(clone->ops->nvlinearsum, x_->get()->ops->nvlinearsum);
  EXPECT_EQ(clone->ops->nvlinearcombination, x_->get()->ops->nvlinearcombination);
  N_VDestroy(clone);
}

}  // namespace
}  // namespace stillzone::core
