#!/bin/sh
# `raddle demo` on its small scene: exit codes, files, the same bits with any number of threads, and the judgement of
# `raddle check` with and without response. Usage: demo.sh RADDLE
set -u
raddle=$1
work=$(mktemp -d)
trap 'rm -rf "$work"' EXIT
cd "$work" || exit 3
checks=0
failures=0

# expect TEXT COMMAND...: the command must succeed.
expect() {
    text=$1
    shift
    checks=$((checks + 1))
    if ! "$@"; then
        failures=$((failures + 1))
        echo "FAILED: $text"
    fi
}

# code WANTED ARGUMENTS...: exit code of the program; its output stays in out and err.
code() {
    wanted=$1
    shift
    "$raddle" "$@" >out 2>err
    got=$?
    [ "$got" -eq "$wanted" ] || { echo "exit code $got: raddle $*"; cat err; return 1; }
}

number() { # KEY: a number of the JSON object in out
    sed -n "s/^ *\"$1\": \([0-9.e+-]*\),*\$/\1/p" out
}

expect 'plays' code 0 demo --small --pictures 32 --threads 1 -o one.h5 --json
expect 'resolves steps' test "$(number resolved)" -gt 5
expect 'corrects vertices' test "$(number moved)" -gt 20
expect 'plays all steps' test "$(number frames)" -eq $(($(number clear) + $(number resolved)))
expect 'draws three stills' test -s one-still-1.png -a -s one-still-2.png -a -s one-still-3.png
expect 'leaves nothing unfinished' test "$(find . -name '*.part' | wc -l)" -eq 0
expect 'its shot is clean' code 0 check one.h5

cp one.h5 before.h5
expect 'refuses to overwrite' code 2 demo --small -o one.h5 --no-stills
expect 'says so in one line' test "$(wc -l <err)" -eq 1
expect 'leaves the old file' cmp one.h5 before.h5
touch new-still-2.png
expect 'refuses old stills too' code 2 demo --small -o new.h5
expect 'and writes nothing then' test ! -e new.h5

expect 'plays with two threads' code 0 demo --small --pictures 32 --threads 2 -o two.h5 --no-stills
expect 'prints a table' grep -q 'steps resolved' out
expect 'the same bits with two threads' cmp one.h5 two.h5

expect 'plays alone' code 0 demo --small --pictures 32 --no-response -o alone.h5 --no-stills
expect 'which is not clean' code 1 check alone.h5

expect 'no such body' code 2 demo --small --body nowhere.obj -o body.h5 --no-stills
printf 'v 0 0 0\nv 1 0 0\nv 0 1 0\nv 0 0 1\nf 1 3 2\nf 1 2 4\nf 2 3 4\n' >open.obj
expect 'a body with a hole' code 2 demo --small --body open.obj -o body.h5 --no-stills
expect 'is called not closed' grep -q 'not closed' err
expect 'no pictures' code 2 demo --pictures 0
expect 'no folder' code 2 demo --small -o body.h5 --stills nowhere
expect 'nothing was written' test ! -e body.h5

"$raddle" demo --small --pictures 100000 -o long.h5 --no-stills >out 2>err &
player=$!
tries=0
while [ ! -s long.h5.part ] && [ "$tries" -lt 300 ]; do
    sleep 0.1
    tries=$((tries + 1))
done
kill -TERM "$player"
wait "$player"
ended=$?
expect 'an interrupt ends with 130' test "$ended" -eq 130
expect 'and keeps what was played' code 0 info long.h5

echo "$((100 * (checks - failures) / checks))%: Checks: $checks, Failures: $failures, Errors: 0"
[ "$failures" -eq 0 ]
