#!/bin/sh
# Runs the command-line tests: each compares exit code, standard output and standard error with what is expected, to the
# byte. Usage: run.sh RADDLE MAKE_SHOT [--update]     (--update writes the expected files anew: review the difference)
set -u

raddle=$(realpath "$1")
make_shot=$(realpath "$2")
update=${3:-}
here=$(CDPATH='' cd -- "$(dirname -- "$0")" && pwd)
work=$(mktemp -d)
trap 'rm -rf "$work"' EXIT
cd "$work" || exit 3
checks=0
failures=0

# fail NAME TEXT
fail() {
    failures=$((failures + 1))
    echo "FAILED: $1: $2"
}

# compare NAME KIND: the file KIND of this run with expected/NAME.KIND, which is left out where it is empty.
compare() {
    wanted=$here/expected/$1.$2
    if [ "$update" = --update ]; then
        rm -f "$wanted"
        if [ -s "$2" ]; then
            cp "$2" "$wanted"
        fi
    fi
    if [ ! -f "$wanted" ]; then
        wanted=/dev/null
    fi
    if ! cmp -s "$wanted" "$2"; then
        diff -u "$wanted" "$2"
        return 1
    fi
}

# try NAME CODE ARGUMENTS...: one run of the program. $filter, if set, is a sed script for what varies between runs.
filter=''
try() {
    name=$1
    code=$2
    shift 2
    checks=$((checks + 1))
    "$raddle" "$@" >out.raw 2>err
    got=$?
    sed -e "$filter" out.raw >out
    if [ "$got" -ne "$code" ]; then
        cat err
        fail "$name" "exit code $got instead of $code"
    elif ! compare "$name" out || ! compare "$name" err; then
        fail "$name" "other output"
    fi
}

# holds NAME CONDITION...: a test command that must be true.
holds() {
    name=$1
    shift
    checks=$((checks + 1))
    if ! test "$@"; then
        fail "$name" "test $* is not true"
    fi
}

# only FILE...: these and no other files are there.
only() {
    checks=$((checks + 1))
    rm -f out out.raw err
    wanted=$(printf '%s\n' "$@" | LC_ALL=C sort)
    found=$(find . -type f | sed 's,^\./,,' | LC_ALL=C sort)
    if [ "$wanted" != "$found" ]; then
        fail "files after $name" "$found"
    fi
}

make() {
    "$make_shot" "$1" "$2" || fail "make_shot $1" "no shot"
}

for group in usage info check resolve replay reduce import export interrupt; do
    rm -rf "${work:?}"/*
    # shellcheck source=/dev/null
    . "$here/$group.sh"
done

if [ "$checks" -lt 1 ]; then
    failures=1
fi
echo "$((checks > 0 ? 100 * (checks - failures) / checks : 0))%: Checks: $checks, Failures: $failures, Errors: 0"
[ "$failures" -eq 0 ]
