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
# Single trials of the same story: how cortex answers to the surprise of a beat.
"$headwater" run "$folder/recordings.toml"
"$headwater" draw "$folder/recordings.toml"

cat <<END

The experiment files: $experiment
                      $folder/recordings.toml  (single trials)
Tables and volumes:   $folder/results, $folder/results_recordings
Pictures:             the folder figures in each
Run it again:         $headwater run $experiment
END
