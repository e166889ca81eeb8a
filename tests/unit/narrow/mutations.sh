#!/bin/sh
# Are the tests of the narrow phase able to fail? Each mutation below breaks one promise in a copy of the sources; the tests
# must notice. Takes some minutes.
# Usage: sh tests/unit/narrow/mutations.sh ROOT
set -eu

root=$(cd "$1" && pwd)
copy=$(mktemp -d)
trap 'rm -rf "$copy"' EXIT
for name in include src tests tools docs meson.build meson.options; do
    if [ -e "$root/$name" ]; then
        cp -R "$root/$name" "$copy/$name"
    fi
done
for name in README.md LICENSE DEVELOPERS.md; do
    if [ -e "$root/$name" ]; then
        cp "$root/$name" "$copy/$name"
    fi
done
build=$copy/build
meson setup "$build" "$copy" >"$copy/setup.log" 2>&1 || { cat "$copy/setup.log"; exit 2; }
known=tests/unit/narrow/test_narrow_known
rest=tests/unit/narrow/test_narrow_rest
paths=tests/unit/narrow/test_narrow_paths
queries=tests/property/test_queries

# passes: builds, and runs the tests from the fastest to the slowest, up to the first that fails.
passes() {
    ninja -C "$build" "$known" "$rest" "$paths" "$queries" >"$copy/build.log" 2>&1 || { cat "$copy/build.log"; exit 2; }
    "$build/$known" >"$copy/test.log" 2>&1 && "$build/$rest" >"$copy/test.log" 2>&1 &&
        "$build/$paths" >"$copy/test.log" 2>&1 &&
        "$build/$queries" pt zero >"$copy/test.log" 2>&1 && "$build/$queries" ee zero >"$copy/test.log" 2>&1 &&
        "$build/$queries" pt gap >"$copy/test.log" 2>&1 && "$build/$queries" ee gap >"$copy/test.log" 2>&1
}

unseen=0
# mutate NAME FILE SED-EXPRESSION
mutate() {
    cp "$copy/$2" "$copy/kept"
    sed "$3" "$copy/kept" >"$copy/$2"
    if cmp -s "$copy/kept" "$copy/$2"; then
        echo "$1: nothing to change in $2"
        exit 2
    fi
    if passes; then
        echo "$1: NOT noticed"
        unseen=$((unseen + 1))
    else
        echo "$1: noticed by $(grep -m 1 -o 'families:[a-z_]*\|all:[a-z_]*' "$copy/test.log" || echo a crash)"
    fi
    cp "$copy/kept" "$copy/$2"
}

if [ "${2:-}" != quick ]; then
    passes || { echo "the tests fail without a mutation"; cat "$copy/test.log"; exit 2; }
fi
mutate "no rounding bound of the cubic" src/narrow/roots.c 's/s->bound = 64 \* unit \* size/s->bound = 0 * size/'
mutate "no rounding bound of the parameters" src/narrow/roots.c 's/q->bound = 16 \* unit \* largest/q->bound = 0 * largest/'
mutate "no rounding bound of the cubic in the lanes" src/narrow/screen_kernel.h 's/\*bound = size \* (64 \* UNIT)/*bound = size * 0/'
mutate "no margin of the inside test in the lanes" src/narrow/meet_kernel.h 's/double loss = 8.01 \* BRACKET + 0x1p-44/double loss = 0/'
mutate "no rounding of the frames in the lanes" src/narrow/screen_kernel.h 's/b.pad = 0x1p-47 \* size/b.pad = -0x1p-39 * size/'
mutate "a turning direction judged by its ends" src/narrow/approach_kernel.h \
    's/smaller(smaller(first, last), 0.5 \* middle)/smaller(first, last)/'
mutate "a second root forgotten in the lanes" src/narrow/meet_kernel.h 's/        ask &= ~(c->open | c->touch);/        ask \&= ~(c->open | twice);/'
mutate "contact at the end forgotten in words" src/narrow/words.c 's/touch->touches || (sign\[3\] == 0 \&\& meets_at(&p, 1))/touch->touches/'
mutate "residues believed without a bound" src/narrow/words.c 's/scale) < 0x1p126/scale) < 0x1p1000/'
mutate "one couple of edges dropped" src/narrow/exact_pair.c 's/    return 4;/    return 3;/'
mutate "one couple of edges dropped in doubles" src/narrow/span.c \
    's/inner_segment_keeps(&side, &l->v, &l->difference\[2\], level, order)/true/'
mutate "exact stage says apart" src/narrow/exact_zero.c \
    's/    \*touch = (rdl_touch){.stage = RDL_STAGE_EXACT, .order = 3};/    *touch = (rdl_touch){.time_lo = 1, .time_hi = 1, .stage = RDL_STAGE_EXACT}; if (motion) return;/'
mutate "planar motion never meets" src/narrow/exact_zero.c \
    's/        ? first_planar_event(arena, \&pair, doubles, touch)/        ? false/'
mutate "no rounding of the frames at a gap" src/narrow/series.c 's/s.pad = 6 \* 0x1p-48/s.pad = -6 * 0x1p-40/'
mutate "exact gap too generous" src/narrow/exact_gap.c 's/ALARM_BITS = 19/ALARM_BITS = 15/'
if [ "$unseen" -gt 0 ]; then
    echo "$unseen mutations were not noticed"
    exit 1
fi
