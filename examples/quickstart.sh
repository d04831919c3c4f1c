#!/usr/bin/env bash
# SPDX-License-Identifier: GPL-3.0-or-later
# quickstart.sh [FOLDER]
# From a bare Debian 12 to located sources: installs the packages that are missing, builds Headwater,
# writes the invented example experiment into FOLDER (default: headwater-example in the folder you
# call this from), locates its sources and draws them.
set -euo pipefail
root=$(cd "$(dirname "${BASH_SOURCE[0]}")/.." && pwd)
folder=${1:-headwater-example}
case $folder in /*) ;; *) folder=$PWD/$folder ;; esac

bash "$root/examples/build.sh" program "$root/examples/debian-packages.txt"
headwater=$root/build/bin/headwater
experiment=$folder/experiment.toml
# The example is written once: called again, the experiment - with your changes - is run again.
[ -e "$experiment" ] || "$headwater" example "$folder"
"$headwater" run "$experiment"
"$headwater" draw "$experiment"

cat <<END

The experiment file:  $experiment
Tables and volumes:   $folder/results
Pictures:             $folder/results/figures
Run it again:         $headwater run $experiment
END
