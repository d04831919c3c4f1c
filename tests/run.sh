#!/usr/bin/env bash
# SPDX-License-Identifier: GPL-3.0-or-later
# Everything from a bare Debian 12 to the result of every test: packages, build, ctest. Arguments go to
# ctest, e.g. tests/run.sh -L architecture. The exit code is ctest's.
set -euo pipefail
root=$(cd "$(dirname "${BASH_SOURCE[0]}")/.." && pwd)
bash "$root/examples/build.sh" release \
  "$root/examples/debian-packages.txt" "$root/tests/debian-packages.txt"
cd "$root"
exec ctest --preset release --parallel "$(nproc)" "$@"
