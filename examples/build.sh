#!/usr/bin/env bash
# SPDX-License-Identifier: GPL-3.0-or-later
# build.sh PRESET PACKAGE_LIST...
# Installs the Debian packages of the lists that are missing, then configures and builds a preset of
# CMakePresets.json. Root or sudo is needed only where a package is missing.
set -euo pipefail
root=$(cd "$(dirname "${BASH_SOURCE[0]}")/.." && pwd)
preset=$1
shift

is_installed() {
  [ "$(dpkg-query -W -f='${db:Status-Status}' "$1" 2>/dev/null)" = installed ]
}

install_missing() {
  local package missing=() as_root=()
  for package in $(sed 's/#.*//' "$@"); do
    is_installed "$package" || missing+=("$package")
  done
  [ ${#missing[@]} -gt 0 ] || return 0
  echo "Debian packages to install: ${missing[*]}"
  if [ "$(id -u)" -ne 0 ]; then
    if ! command -v sudo >/dev/null; then
      echo "Installing them needs root: run 'apt-get install ${missing[*]}' as root, then this again." >&2
      exit 1
    fi
    echo "Installing them needs root: sudo may ask for your password."
    as_root=(sudo)
  fi
  local apt=("${as_root[@]}" env DEBIAN_FRONTEND=noninteractive
             apt-get -o DPkg::Lock::Timeout=300 -qq -y)
  "${apt[@]}" update
  "${apt[@]}" install --no-install-recommends "${missing[@]}" >/dev/null
}

if command -v dpkg-query >/dev/null; then
  install_missing "$@"
else
  echo "This is no Debian system: what is missing has to be installed by hand (lists: $*)." >&2
fi

# The geometry and drawing sources take 1.2 GB each to compile: no more at once than fit.
processors=$(nproc)
fitting=$(awk '/^MemAvailable/ { print int($2 / 1300000) }' /proc/meminfo)
jobs=$((fitting < processors ? fitting : processors))
cd "$root"
cmake --preset "$preset"
cmake --build --preset "$preset" --parallel $((jobs > 0 ? jobs : 1))
