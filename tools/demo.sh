#!/bin/sh
# The main job in one command: installs what is missing, builds raddle, runs its demo, and lets `raddle check` judge the
# result without trusting the resolver. Options given here go to `raddle demo`.
# Usage: sh tools/demo.sh [OPTIONS OF raddle demo]
set -eu

root=$(CDPATH='' cd -- "$(dirname -- "$0")/.." && pwd)
build=$root/build
shot=$build/demo/demo.h5

sh "$root/tools/setup.sh" build
if [ ! -f "$build/build.ninja" ]; then
    meson setup --buildtype=release "$build" "$root"
fi
ninja -C "$build" tools/raddle
mkdir -p "$build/demo"
cd "$build/demo"
"$build/tools/raddle" demo --force -o "$shot" "$@"
"$build/tools/raddle" check "$shot"
