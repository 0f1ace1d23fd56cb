#!/usr/bin/env bash
# Renders the sample shoot again: the same frames and the same truth, to the byte on the same machine.
#   bash sample-images/make.sh [FOLDER] [WORD...]   default: this folder, all frames
set -euo pipefail
here=$(cd "$(dirname "${BASH_SOURCE[0]}")" && pwd)
top=$(cd "$here/.." && pwd)
build=$top/build-tests
cmake -S "$top" -B "$build" -G Ninja -DCMAKE_BUILD_TYPE=Release -DFOCUSFALL_TESTS=ON >/dev/null
cmake --build "$build" --target sample_maker
folder=${1:-$here}
[ $# -eq 0 ] || shift
exec "$build/tests/render/sample_maker" "$folder" "$@"
