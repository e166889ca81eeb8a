#!/bin/sh
# Everything that must pass, in one command: installs what is missing, then builds and runs
#   release   every test, optimised as shipped but with the assertions on and warnings as errors;
#   address   the tests again under the address and undefined-behaviour sanitizers, without the suites `slow`, `bench`
#             and `package`;
#   threads   the suite `threads` under the thread sanitizer.
# The last line counts each test of the release build once; a failure in any of the three builds adds to `failed`.
# Usage: sh tools/test.sh
set -eu

root=$(CDPATH='' cd -- "$(dirname -- "$0")/.." && pwd)
minimum=$root/tests/minimum-count.txt
passed=0
failed=0

# Tests read their own limits from the environment of Check; the summary needs its usual line.
export CK_VERBOSITY=normal
export ASAN_OPTIONS=detect_leaks=1:abort_on_error=0
export UBSAN_OPTIONS=halt_on_error=1:print_stacktrace=1
export TSAN_OPTIONS=halt_on_error=1

# build NAME OPTIONS OF meson setup: configures (afresh where the options changed) and compiles into build-NAME. The
# thread sanitizer's few tests are compiled by `meson test`, which builds no more than it runs.
build() {
    name=$1
    folder=$root/build-$1
    shift
    if [ -f "$folder/build.ninja" ]; then
        meson setup --reconfigure "$@" "$folder" "$root" >"$folder.log" 2>&1 || return 1
    else
        meson setup "$@" "$folder" "$root" >"$folder.log" 2>&1 || return 1
    fi
    [ "$name" = threads ] || ninja -C "$folder" >>"$folder.log" 2>&1
}

# run NAME OPTIONS OF meson test: runs tests of build-NAME and sets run_passed, run_failed.
run() {
    name=$1
    folder=$root/build-$name
    shift
    rm -f "$folder/meson-logs/testlog.json"
    meson test -C "$folder" --print-errorlogs "$@" || true
    run_passed=0
    run_failed=1
    if [ -f "$folder/meson-logs/testlog.json" ]; then
        sums=$(awk -f "$root/tools/count-tests.awk" "$folder/meson-logs/testlog.json")
        run_passed=${sums% *}
        run_failed=${sums#* }
    else
        echo "test: no test log in build-$name"
    fi
    least=$(awk -v name="$name" '$1 == name { print $2 }' "$minimum")
    if [ -z "$least" ] || [ $((run_passed + run_failed)) -lt "$least" ]; then
        echo "test: $name ran $((run_passed + run_failed)) tests, fewer than ${least:-the missing number} in tests/minimum-count.txt"
        run_failed=$((run_failed + 1))
    fi
}

# stage NAME TITLE COUNTED [SETUP OPTIONS] -- [TEST OPTIONS]
stage() {
    name=$1
    title=$2
    counted=$3
    shift 3
    setup_options=''
    while [ "$1" != -- ]; do
        setup_options="$setup_options $1"
        shift
    done
    shift
    echo "== $title"
    # Options without blanks, to be split here.
    # shellcheck disable=SC2086
    if ! build "$name" $setup_options; then
        cat "$root/build-$name.log"
        echo "test: build-$name does not build"
        failed=$((failed + 1))
        return 0
    fi
    run "$name" "$@"
    echo "== $name: $run_passed passed, $run_failed failed"
    if [ "$counted" = yes ]; then
        passed=$((passed + run_passed))
    fi
    failed=$((failed + run_failed))
}

sh "$root/tools/setup.sh" test
export CK_TIMEOUT_MULTIPLIER=10 # a busy machine is no failure
stage release 'release build, assertions on' yes \
    --buildtype=release -Db_ndebug=false -Dwerror=true -- \
    --timeout-multiplier 4
stage address 'address and undefined-behaviour sanitizers' no \
    --buildtype=debugoptimized -Db_sanitize=address,undefined -Db_lundef=false -- \
    --no-suite slow --no-suite bench --no-suite package --timeout-multiplier 10
# The thread sanitizer does not follow a fork.
export CK_FORK=no
stage threads 'thread sanitizer' no \
    --buildtype=debugoptimized -Db_sanitize=thread -Db_lundef=false -- \
    --suite threads --timeout-multiplier 10

echo "$passed passed, $failed failed"
[ "$failed" -eq 0 ]
