#!/bin/sh
# Code blocks of docs/integrate.md that name a source file must be found in it, line for line.
# Usage: sh snippets.sh ROOT
set -eu
cd "$1"
awk '
    function fail(text) { print text; failures++ }
    /^<!-- from .* -->$/ { source = $3; next }
    /^```c$/ {
        if (source == "") { fail("docs/integrate.md:" FNR ": a block without its source"); next }
        whole = ""
        while ((getline line < source) > 0) whole = whole line "\n"
        close(source)
        block = ""
        inside = 1
        next
    }
    /^```$/ && inside {
        inside = 0
        checks++
        if (index(whole, block) == 0) fail("docs/integrate.md:" FNR ": not in " source)
        source = ""
        next
    }
    inside { block = block $0 "\n" }
    END {
        if (checks < 5) fail("only " checks + 0 " blocks found")
        printf "%d%%: Checks: %d, Failures: %d, Errors: 0\n", failures ? 0 : 100, checks, failures
        exit failures > 0
    }
' docs/integrate.md
