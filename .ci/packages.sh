#!/usr/bin/env bash
# The Debian packages Stillzone needs, in one place. Installs what is missing (with sudo when not
# root) and is quick when everything is there.
#   .ci/packages.sh build   what building and running needs
#   .ci/packages.sh test    and what the tests need besides
set -euo pipefail

build=(g++ cmake ninja-build pkg-config git libsundials-dev libsuitesparse-dev libeigen3-dev
       nlohmann-json3-dev libspdlog-dev libboost-dev libcli11-dev libudunits2-dev libceres-dev
       libnetcdf-dev libgraphviz-dev)
test=(libgtest-dev libgmock-dev clang-format python3 python3-jsonschema python3-netcdf4 chromium
      poppler-utils)

case "${1:-}" in
  build) wanted=("${build[@]}") ;;
  test) wanted=("${build[@]}" "${test[@]}") ;;
  *) echo "usage: $0 build|test" >&2; exit 2 ;;
esac

missing=()
for package in "${wanted[@]}"; do
  state=$(dpkg-query -W -f='${db:Status-Status}' "$package" 2>/dev/null || true)
  [ "$state" = installed ] || missing+=("$package")
done
[ ${#missing[@]} -eq 0 ] && exit 0

as_root=()
if [ "$(id -u)" -ne 0 ]; then
  command -v sudo >/dev/null || { echo "Please install as root: ${missing[*]}" >&2; exit 1; }
  as_root=(sudo)
fi
echo "Installing: ${missing[*]}" >&2
"${as_root[@]}" apt-get update -qq
"${as_root[@]}" env DEBIAN_FRONTEND=noninteractive \
  apt-get install -y -qq --no-install-recommends "${missing[@]}" >&2
