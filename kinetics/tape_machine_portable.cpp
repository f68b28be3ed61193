#include "kinetics/tape_kernel.hpp"
#include "kinetics/tape_machine.hpp"

namespace stillzone::kinetics {

namespace {

struct Portable {
  static constexpr bool kFused = false;

  static void turn4(const double* r0, const double* r1, const double* r2, const double* r3,
                    double* c0, double* c1, double* c2, double* c3) {
    const double* rows[4] = {r0, r1, r2, r3};
    double* columns[4] = {c0, c1, c2, c3};
    double block[4][4];
    for (int i = 0; i < 4; ++i) {
      for (int j = 0; j < 4; ++j) block[j][i] = rows[i][j];
    }
    for (int j = 0; j < 4; ++j) {
      for (int i = 0; i < 4; ++i) columns[j][i] = block[j][i];
    }
  }
};

constexpr TapeMachineCode kCode = machine_code<Portable, 2>();

}  // namespace

const TapeMachineCode& portable_machine_code() { return kCode; }

}  // namespace stillzone::kinetics
