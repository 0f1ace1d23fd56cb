#!/usr/bin/env bash
# Sets up, builds and runs all tests.
#   bash tests/run.sh [--yes] [--accuracy | --golden] [ctest arguments...]
#   --accuracy   print the accuracy tables from the full sets of rendered frames instead of running the tests
#   --golden     write the golden output anew (tests/cli/golden); read the difference before you commit it
set -euo pipefail
top=$(cd "$(dirname "${BASH_SOURCE[0]}")/.." && pwd)
yes=0 accuracy=0 golden=0
while [ $# -gt 0 ]; do
  case "$1" in
    --yes) yes=1; shift;;
    --accuracy) accuracy=1; shift;;
    --golden) golden=1; shift;;
    *) break;;
  esac
done
# shellcheck source=src/setup.sh
. "$top/src/setup.sh"
lists=("$top/src/packages.txt" "$top/tests/packages.txt")
command -v npm >/dev/null || lists+=("$top/src/page/packages.txt")
install_packages "$yes" "${lists[@]}"
build=$top/build-tests
cmake -S "$top" -B "$build" -G Ninja -DCMAKE_BUILD_TYPE=Release -DFOCUSFALL_TESTS=ON >/dev/null
cmake --build "$build"
if [ "$accuracy" = 1 ]; then
  exec "$build/tests/accuracy/accuracy" "$@"
fi
if [ "$golden" = 1 ]; then
  exec env FOCUSFALL="$build/focusfall" FOCUSFALL_GOLDEN=write PYTHONDONTWRITEBYTECODE=1 \
    python3 "$top/tests/cli/golden_test.py"
fi
bash "$top/tests/fetch_open_data.sh" "$build/open-data"
exec ctest --test-dir "$build" --output-on-failure --no-tests=error -j "$(nproc)" "$@"
