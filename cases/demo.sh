#!/usr/bin/env bash
# From nothing to a report: installs what is missing, builds Release, runs a shipped case.
set -euo pipefail
cd "$(dirname "$0")/.."

.ci/packages.sh build
cmake --preset release >/dev/null
cmake --build --preset release -j "$(nproc)"
program=build/release/bin/stillzone

"$program" check cases/short_circuit_stagnant.json
"$program" run cases/short_circuit_stagnant.json --out build/demo.out
"$program" washout cases/near_washout.json --out build/demo_washout.out
echo
echo "The report: $PWD/build/demo.out/report.html"
