# Shared by src/run.sh and tests/run.sh: installs the Debian packages named in lists. Sourced, not run.

# missing_packages LIST...: prints the packages of the lists that are not installed.
missing_packages() {
  sed -e 's/#.*//' -e 's/[[:space:]]//g' "$@" | sed '/^$/d' | sort -u | while read -r package; do
    dpkg-query -W -f '${db:Status-Status}' "$package" 2>/dev/null | grep -qx installed || echo "$package"
  done
}

# install_packages YES LIST...: installs what is missing; asks first on a terminal unless YES is 1.
install_packages() {
  local yes=$1; shift
  local missing; missing=$(missing_packages "$@" | tr '\n' ' ')
  [ -n "$missing" ] || return 0
  echo "These Debian packages are needed and not installed:" >&2
  echo "  $missing" | fold -s -w 100 >&2; echo >&2
  if [ "$yes" != 1 ] && [ -t 0 ] && [ -t 2 ]; then
    read -r -p "Install them now? [Y/n] " answer >&2
    case "$answer" in [nN]*) echo "Nothing was installed." >&2; return 1;; esac
  fi
  local as_root=""
  if [ "$(id -u)" != 0 ]; then
    command -v sudo >/dev/null || { echo "Needs root or sudo to install packages." >&2; return 1; }
    as_root=sudo
  fi
  # shellcheck disable=SC2086
  $as_root apt-get update -qq >&2 &&
    $as_root env DEBIAN_FRONTEND=noninteractive apt-get install -y -qq --no-install-recommends $missing >&2
}
