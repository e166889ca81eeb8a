#!/bin/sh
# A defect on purpose (planted.c) is found by replay, brought down by reduce, and the C test that reduce writes tells the
# defective library from the sound one; it is built against the installed library with nothing but pkg-config.
# Usage: planted.sh RADDLE MAKE_STORY PLANTED_LIBRARY SOUND_LIBRARY BUILD_FOLDER
set -u

raddle=$(realpath "$1")
make_story=$(realpath "$2")
defect=$(dirname "$(realpath "$3")")
sound=$(dirname "$(realpath "$4")")
build=$5
: "${CC:=cc}"
work=$(mktemp -d)
trap 'rm -rf "$work"' EXIT
cd "$work" || exit 3
checks=0
failures=0

# judge NAME CODE COMMAND...
judge() {
    name=$1
    code=$2
    shift 2
    checks=$((checks + 1))
    "$@" >text 2>&1
    got=$?
    if [ "$got" -ne "$code" ]; then
        failures=$((failures + 1))
        echo "FAILED: $name: code $got instead of $code"
        cat text
    fi
}

holds() {
    name=$1
    shift
    judge "$name" 0 "$@"
}

with_defect() {
    LD_LIBRARY_PATH=$defect "$@"
}

with_sound() {
    LD_LIBRARY_PATH=$sound "$@"
}

"$make_story" fast_comb small story.h5 >made
judge 'sound resolve' 0 with_sound "$raddle" resolve story.h5 -o good.h5 --most 0
judge 'sound trace' 0 with_sound "$raddle" replay good.h5 --trace
with_defect "$raddle" resolve story.h5 -o bad.h5 --most 0 >text
judge 'trace of the defect' 0 with_defect "$raddle" replay bad.h5 --trace

# Frame 1, the first list of pairs, an edge pair of comb and curtain.
judge 'replay --against' 1 with_sound "$raddle" replay good.h5 --against bad.h5
cp text against
holds 'the right frame and stage' grep -qE '^first difference: frame 1, pairs of detection 0: ee:[0-9:]* [(]edge [-0-9]* of "curtain", edge [-0-9]* of "comb"' against
holds 'the pair is here' grep -qx '  this shot : a candidate' against
holds 'the pair is missing there' grep -qx '  the other: absent' against
judge 'replay under the defect' 1 with_defect "$raddle" replay good.h5
cp text alone
holds 'it names the pair' grep -qE '^first difference: frame 1, pairs of detection 0: ee:[0-9:]* [(]edge [-0-9]* of "curtain", edge [-0-9]* of "comb"' alone

judge 'nothing to reduce in the sound one' 2 with_sound "$raddle" reduce story.h5 --frame 1 --keep missed -o red.h5
judge 'reduce' 0 with_defect "$raddle" reduce story.h5 --frame 1 --keep missed -o red.h5
cp text few
holds 'a few elements' grep -qE '^([1-9]|1[012]) of 50 elements' few

mkdir stage
judge 'install' 0 meson install -C "$build" --no-rebuild --destdir "$work/stage"
pc=$(find "$work/stage" -name raddle.pc)
PKG_CONFIG_PATH=${pc%/*}
export PKG_CONFIG_PATH
prefix=$work/stage$(sed -n 's/^prefix=//p' "$pc")
# Flags of pkg-config, to be split here; the folder's name has no blanks.
# shellcheck disable=SC2046
judge 'the C test compiles' 0 "$CC" -std=c17 -Wall -Wextra -Wpedantic -Werror red.c -o red \
    $(pkg-config --define-variable=prefix="$prefix" --cflags --libs raddle)
judge 'the C test fails under the defect' 1 with_defect ./red
judge 'the C test passes without it' 0 with_sound ./red

echo "$((100 * (checks - failures) / checks))%: Checks: $checks, Failures: $failures, Errors: 0"
[ "$failures" -eq 0 ]
