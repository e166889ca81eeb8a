#!/bin/sh
# --explain on pairs with known answers: the times in one plane, where the features meet then, whether they touch, and what
# decided it.
# Usage: explain.sh RADDLE MAKE_CASE
set -u

raddle=$(realpath "$1")
make_case=$(realpath "$2")
work=$(mktemp -d)
trap 'rm -rf "$work"' EXIT
cd "$work" || exit 3
checks=0
failures=0

# says NUMBER LINE...: each is a whole line of the text.
says() {
    number=$1
    shift
    pair=pt:0:0
    [ "$number" -le 5 ] || pair=ee:0-1:2-3
    "$make_case" "$number" case.h5
    "$raddle" replay case.h5 --explain "$pair" >text 2>err
    code=$?
    checks=$((checks + 1))
    if [ "$code" -ne 0 ] || [ -s err ]; then
        failures=$((failures + 1))
        echo "FAILED: case $number: code $code"
        cat err
    fi
    for line in "$@" '    decided by *'; do
        checks=$((checks + 1))
        found=no
        while IFS= read -r row; do
            # The pattern is a pattern.
            # shellcheck disable=SC2254
            case $row in
            $line) found=yes ;;
            esac
        done <text
        if [ "$found" = no ]; then
            failures=$((failures + 1))
            echo "FAILED: case $number does not say: $line"
            cat text
        fi
    done
    for heading in 'Who they are' 'What they should keep' 'What the engine did with it' 'How it ended'; do
        checks=$((checks + 1))
        grep -qx "$heading" text || {
            failures=$((failures + 1))
            echo "FAILED: case $number has no section: $heading"
        }
    done
}

half='  do they touch: yes, first between 0.[45]* and 0.5* of the step'
says 1 '  in one plane at 0.5, and the point is in the triangle, weights 0.5, 0.25, 0.25' "$half"
says 2 '  in one plane at 0.5, and the point is in the triangle, weights 0, 0.5, 0.5' "$half"
says 3 '  in one plane at 1, and the point is in the triangle, weights 0.5, 0.25, 0.25' \
    '  do they touch: yes, first between * and 1 of the step'
says 4 '  in one plane at 0.5, touching the plane only (double), and the point is in the triangle, weights 0.5, 0.25, 0.25' \
    "$half (they graze, and do not cross)"
says 5 '  in one plane at 0.375, and the point is in the triangle, weights *' \
    '  in one plane at 0.625, and the point is in the triangle, weights *' \
    '  do they touch: yes, first between 0.37* and 0.375* of the step'
says 6 '  in one plane at 0.5, and the edges meet, at 0.5 of the first and 0.5 of the second' "$half"
says 7 '  in one plane at 0.5, flat (triple), and the edges meet, *' "$half"
says 8 '  the four points stay in one plane all the time: points and edges within the plane decide' "$half"

echo "$((100 * (checks - failures) / checks))%: Checks: $checks, Failures: $failures, Errors: 0"
[ "$failures" -eq 0 ]
