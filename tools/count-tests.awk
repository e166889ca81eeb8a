# Reads meson-logs/testlog.json (one test program a line) and prints "PASSED FAILED", summed over Check's closing lines
# ("100%: Checks: 6, Failures: 0, Errors: 0"). A program that crashed, timed out, exited with an error or printed no such
# line counts as one failure more; a skipped one counts as nothing. Names of failing programs go to standard error.
{
    name = $0
    sub(/^\{"name": "/, "", name)
    sub(/".*/, "", name)
    # Quotes inside the captured output are written \", so this cannot match there.
    ok = index($0, "\"result\": \"OK\"") > 0
    if (index($0, "\"result\": \"SKIP\"") > 0) {
        print "skipped: " name | "cat 1>&2"
        next
    }
    rest = $0
    lines = 0
    bad = 0
    while (match(rest, /Checks: [0-9]+, Failures: [0-9]+, Errors: [0-9]+/)) {
        split(substr(rest, RSTART, RLENGTH), part, /[:,] */)
        rest = substr(rest, RSTART + RLENGTH)
        lines++
        bad += part[4] + part[6]
        passed += part[2] - part[4] - part[6]
    }
    if (lines == 0 || (!ok && bad == 0))
        bad++
    failed += bad
    if (bad > 0)
        print "failed: " name | "cat 1>&2"
}
END { print passed + 0, failed + 0 }
