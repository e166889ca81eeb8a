#!/bin/sh
# The failure stories: each generator still gives the file that lies in fixtures/ (small), the verdicts are those of the
# manifest, what is resolved replays to the same bits, and reduce brings the bad frame down to the size that the manifest
# allows, with the failure still there.
# Usage: stories.sh RADDLE MAKE_STORY MANIFEST small|full
# full: scenes of at least 5,000 elements; RADDLE_STORIES=all takes those that need more than a minute, too.
set -u

raddle=$(realpath "$1")
make_story=$(realpath "$2")
fixtures=$(dirname "$(realpath "$3")")
size=$4
work=$(mktemp -d)
trap 'rm -rf "$work"' EXIT
cd "$work" || exit 3
checks=0
failures=0

fail() {
    failures=$((failures + 1))
    echo "FAILED: $*"
}

# number FILE KEY: a number of a JSON object.
number() {
    sed -n "s/^  \"$2\": \\([0-9]*\\),*\$/\\1/p" "$1"
}

tell() {
    if [ "$size" = small ]; then
        checks=$((checks + 1))
        cmp -s "$name.h5" "$fixtures/$name.h5" || fail "$name: the generator gives another file"
    fi
    elements=$(cat made)
    checks=$((checks + 1))
    [ "$size" = small ] || [ "${elements% *}" -ge 5000 ] || fail "$name: $elements only"
    "$raddle" resolve "$name.h5" -o out.h5 --force --most 0 >text 2>&1
    checks=$((checks + 1))
    grep -q "^2 frames: $verdicts;" text || fail "$name: not $verdicts: $(grep frames: text)"
    checks=$((checks + 1))
    "$raddle" replay out.h5 --threads 3 --vector off >text 2>&1 || fail "$name: $(cat text)"
    checks=$((checks + 1))
    "$raddle" reduce "$name.h5" --frame 1 --keep "$keep" -o red.h5 --force --json >json 2>err || fail "$name: $(cat err)"
    left=$(number json elements)
    checks=$((checks + 1))
    [ "${left:-999}" -le "$most" ] || fail "$name: $left elements are left, $most are allowed"
    # What is left still shows it: reducing again starts with that question.
    checks=$((checks + 1))
    "$raddle" reduce red.h5 --keep "$keep" -o again.h5 --force >text 2>&1 || fail "$name: $(cat text)"
}

while IFS=, read -r name _ _ verdicts keep most weight _; do
    [ "$name" != name ] || continue
    if [ "$size" = full ] && [ "$weight" = heavy ] && [ "${RADDLE_STORIES:-}" != all ]; then
        continue
    fi
    "$make_story" "$name" "$size" "$name.h5" >made || fail "$name: not made"
    verdicts=$(echo "$verdicts" | tr ';' ',')
    tell
done <"$fixtures/manifest.csv"

[ "$checks" -gt 0 ] || failures=1
echo "$((checks > 0 ? 100 * (checks - failures) / checks : 0))%: Checks: $checks, Failures: $failures, Errors: 0"
[ "$failures" -eq 0 ]
