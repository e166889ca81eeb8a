#!/bin/sh
# replay and reduce on damaged files: cut at every tenth, a bit flipped at every fiftieth of the length and in each of the
# first 64 bytes: one line, exit code 2 or 3 (HDF5 crashed), nothing written; or the damage did not matter.
# Usage: damaged.sh RADDLE MAKE_STORY
set -u

raddle=$(realpath "$1")
make_story=$(realpath "$2")
work=$(mktemp -d)
trap 'rm -rf "$work"' EXIT
cd "$work" || exit 3
checks=0
failures=0

# look WHAT: both verbs on bad.h5.
look() {
    checks=$((checks + 1))
    "$raddle" replay bad.h5 >out 2>err
    code=$?
    lines=$(wc -l <err)
    case $code in
    0) [ "$lines" -eq 0 ] ;;
    1) grep -q '^first difference' out ;;
    2 | 3) [ "$lines" -eq 1 ] && [ ! -s out ] ;;
    *) false ;;
    esac || {
        failures=$((failures + 1))
        echo "FAILED: replay, $1: code $code"
        cat err
    }
    [ "$2" = both ] || return 0
    checks=$((checks + 1))
    "$raddle" reduce bad.h5 --frame 1 --keep verdict:tangled -o red.h5 >out 2>err
    code=$?
    lines=$(wc -l <err)
    if { [ "$code" -eq 2 ] || [ "$code" -eq 3 ]; } && { [ "$lines" -ne 1 ] || [ -e red.h5 ]; }; then
        failures=$((failures + 1))
        echo "FAILED: reduce, $1: code $code"
        cat err
    fi
    rm -f red.*
}

"$make_story" tangled_start small story.h5 >out
"$raddle" resolve story.h5 -o good.h5 >out
bytes=$(wc -c <good.h5)
for tenth in 0 1 2 3 4 5 6 7 8 9; do
    head -c $((bytes * tenth / 10)) good.h5 >bad.h5
    look "cut at $tenth tenths" both
    cp bad.h5 bad.h5.part
    rm bad.h5.part
done

# flip BYTE
flip() {
    cp good.h5 bad.h5
    old=$(od -An -tu1 -j "$1" -N 1 good.h5)
    # An octal escape is what printf can write as any byte.
    # shellcheck disable=SC2059
    printf "\\$(printf '%03o' $((old ^ 16)))" | dd of=bad.h5 bs=1 seek="$1" conv=notrunc 2>/dev/null
    look "bit flipped in byte $1" "$2"
}

byte=0
while [ "$byte" -lt 64 ]; do
    flip "$byte" replay
    byte=$((byte + 4))
done
part=1
while [ "$part" -lt 50 ]; do
    flip $((bytes * part / 50)) replay
    part=$((part + 1))
done

echo "$((100 * (checks - failures) / checks))%: Checks: $checks, Failures: $failures, Errors: 0"
[ "$failures" -eq 0 ]
