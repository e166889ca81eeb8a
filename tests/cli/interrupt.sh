# Interrupts: the recording so far is kept, other outputs vanish, the exit code is 130.
make long long.h5

# interrupt SIGNAL NAME ARGUMENTS...: sends SIGNAL as soon as the unfinished output is there.
interrupt() {
    number=$1
    name=$2
    shift 2
    checks=$((checks + 1))
    "$raddle" "$@" >out 2>err &
    child=$!
    tries=0
    while [ ! -f out.h5.part ] && [ "$tries" -lt 200 ]; do
        sleep 0.05
        tries=$((tries + 1))
    done
    kill -s "$number" "$child"
    wait "$child"
    got=$?
    sed -i 's/first [0-9]* frames/first N frames/' err
    if [ "$got" -ne 130 ]; then
        fail "$name" "exit code $got instead of 130"
    elif ! compare "$name" out || ! compare "$name" err; then
        fail "$name" "other output"
    fi
}

for number in INT TERM HUP; do
    interrupt "$number" interrupt-resolve resolve long.h5 -o out.h5
    only long.h5 out.h5.part
    checks=$((checks + 1))
    "$raddle" check out.h5.part >out || fail "interrupt-$number" "the part is not clean"
    rm -f out.h5.part
done
# reduce keeps the best so far.
make resolve resolve.h5
cat >slow.sh <<'END'
echo >>"$2"
sleep 0.1
"$1" check "$3" >/dev/null
END
checks=$((checks + 1))
"$raddle" reduce resolve.h5 --keep "command:sh slow.sh '$raddle' begun \"\$1\"" --jobs 1 -o best.h5 >out 2>err &
child=$!
tries=0
# The first two runs of the command find out what to look for.
while [ "$(cat begun 2>/dev/null | wc -l)" -lt 4 ] && [ "$tries" -lt 400 ]; do
    sleep 0.05
    tries=$((tries + 1))
done
kill -s INT "$child"
wait "$child"
code=$?
[ "$code" -eq 130 ] || fail interrupt-reduce "exit code $code instead of 130"
checks=$((checks + 1))
"$raddle" info best.h5 >out || fail interrupt-reduce 'no shot was kept'
holds interrupt-reduce-files -f best.obj -a -f best.png
rm -f best.* begun slow.sh resolve.h5
only long.h5
