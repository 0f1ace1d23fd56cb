#!/usr/bin/env bash
# Sets up, builds (Release, into build/) and runs focusfall with the arguments given.
#   bash src/run.sh [--yes] [focusfall arguments...]
# Missing Debian packages are listed and installed; on a terminal it asks first, unless --yes comes first.
set -euo pipefail
top=$(cd "$(dirname "${BASH_SOURCE[0]}")/.." && pwd)
yes=0
if [ "${1:-}" = --yes ]; then yes=1; shift; fi

program=$top/build/focusfall
# Nothing newer than the program among the sources: run at once.
if [ ! -x "$program" ] ||
   [ -n "$(find "$top/CMakeLists.txt" "$top/src" "$top/analysis" "$top/metadata" -newer "$program" -type f -print -quit)" ]; then
  # shellcheck source=src/setup.sh
  . "$top/src/setup.sh"
  lists=("$top/src/packages.txt")
  command -v npm >/dev/null || lists+=("$top/src/page/packages.txt")
  install_packages "$yes" "${lists[@]}"
  log=$(mktemp)
  trap 'rm -f "$log"' EXIT
  echo "Building focusfall into build/ (a few minutes the first time)..." >&2
  if ! { cmake -S "$top" -B "$top/build" -G Ninja -DCMAKE_BUILD_TYPE=Release &&
         cmake --build "$top/build"; } >"$log" 2>&1; then
    tail -n 40 "$log" >&2
    echo "The build failed; the lines above say why." >&2
    exit 3
  fi
  touch "$program"
  rm -f "$log"
fi
exec "$program" "$@"
