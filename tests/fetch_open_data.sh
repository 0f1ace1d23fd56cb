#!/usr/bin/env bash
# Fetches the packages with photographs that some tests use, into a cache folder.
#   bash tests/fetch_open_data.sh FOLDER      FOLDER/exif/…, FOLDER/jpeg-exif/…
# What is there already is not fetched again. Without npm, or without a network, the tests that need the photographs
# are skipped and say so; this script then says it too, and succeeds.
set -euo pipefail
folder=${1:?usage: fetch_open_data.sh FOLDER}

# Package, version and licence, one a line. No photograph is copied into the project.
packages="
exif 0.6.0 MIT
jpeg-exif 1.1.4 MIT
"

fetch() {
  local name=$1 version=$2 temporary
  [ -e "$folder/$name/$version.complete" ] && return 0
  command -v npm >/dev/null || { echo "npm is not installed: no open photographs, their tests are skipped." >&2; return 1; }
  temporary=$(mktemp -d "$folder/fetch.XXXXXX")
  if ! (cd "$temporary" && timeout 120 npm pack --silent "$name@$version" >/dev/null 2>&1 && tar -xzf ./*.tgz); then
    rm -rf "$temporary"
    echo "The package $name $version cannot be fetched: its tests are skipped." >&2
    return 1
  fi
  rm -rf "${folder:?}/$name"
  mv "$temporary/package" "$folder/$name"
  touch "$folder/$name/$version.complete"
  rm -rf "$temporary"
}

mkdir -p "$folder"
while read -r name version _licence; do
  [ -n "$name" ] || continue
  fetch "$name" "$version" || true
done <<<"$packages"
