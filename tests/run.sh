#!/usr/bin/env bash
# All tests, from nothing: installs what is missing, checks the formatting, builds the dev preset
# (warnings are errors) and the asan preset (address and undefined-behaviour sanitizers), runs the
# tests of both. `tests/run.sh dev` stops after the dev tests.
set -euo pipefail
cd "$(dirname "$0")/.."
what=${1:-all}
jobs=$(nproc)

.ci/packages.sh test

echo "== formatting"
git ls-files '*.cpp' '*.hpp' | xargs -r clang-format --dry-run --Werror

run_preset() {
  echo "== $1: configure and build"
  cmake --preset "$1" >/dev/null
  cmake --build --preset "$1" -j "$jobs"
  echo "== $1: tests"
  ctest --preset "$1" -j "$jobs"
}
run_preset dev
[ "$what" = dev ] || run_preset asan
