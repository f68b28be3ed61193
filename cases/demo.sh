#!/usr/bin/env bash
# From nothing to reports: installs what is missing, builds Release, runs a shipped case, and goes
# from a tracer test to the digester simulated on the zones found.
set -euo pipefail
cd "$(dirname "$0")/.."

.ci/packages.sh build
cmake --preset release >/dev/null
cmake --build --preset release -j "$(nproc)"
program=build/release/bin/stillzone

"$program" check cases/short_circuit_stagnant.json
"$program" run cases/short_circuit_stagnant.json --out build/demo.out
"$program" plan cases/plan_lithium_test.json --out build/demo_plan.out
"$program" tracer cases/lithium_test.json --emit 1 --feed cases/ideal_tank.json --out build/demo_tracer.out
"$program" check build/demo_tracer.out/*.case.json
"$program" run build/demo_tracer.out/*.case.json --out build/demo_emitted.out
"$program" washout cases/near_washout.json --out build/demo_washout.out
echo
echo "The reports: $PWD/build/demo*.out/report.html"
