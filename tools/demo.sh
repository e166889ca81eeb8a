#!/bin/sh
# The main job in one command: installs what is missing, builds raddle, runs its demo, and lets `raddle check` judge the
# result without trusting the resolver. Options given here go to `raddle demo`.
# Usage: sh tools/demo.sh [OPTIONS OF raddle demo]
set -eu

root=$(CDPATH='' cd -- "$(dirname -- "$0")/.." && pwd)
build=$root/build
shot=$build/demo/demo.h5

sh "$root/tools/setup.sh" build
log=$(mktemp)
trap 'rm -f "$log"' EXIT
echo 'building raddle in build/'
if ! { [ -f "$build/build.ninja" ] || meson setup --buildtype=release "$build" "$root"; } >"$log" 2>&1 ||
    ! ninja -C "$build" tools/raddle >>"$log" 2>&1; then
    cat "$log" >&2
    echo 'demo: raddle does not build' >&2
    exit 3
fi
mkdir -p "$build/demo"
cd "$build/demo"
"$build/tools/raddle" demo --force -o "$shot" "$@"
"$build/tools/raddle" check "$shot"
