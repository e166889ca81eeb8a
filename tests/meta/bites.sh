#!/bin/sh
# Each rule of house.sh and symbols.sh is shown to bite: a copy of the sources gets one offence at a time, and the rule
# must name it. A rule that cannot fail is no rule.
# Usage: sh tests/meta/bites.sh ROOT
set -eu

root=$1
house=$root/tests/meta/house.sh
checks=0
failures=0
copy=$(mktemp -d)
trap 'rm -rf "$copy"' EXIT
for name in .ci .clang-format .gitignore include src tests tools docs meson.build README.md DEVELOPERS.md LICENSE; do
    cp -R "$root/$name" "$copy/$name"
done

# count MESSAGE COMMAND...: one check.
count() {
    checks=$((checks + 1))
    message=$1
    shift
    if ! "$@"; then
        failures=$((failures + 1))
        echo "failed: $message"
    fi
}

# named RULE OFFENDER: the rule fails on the copy and its report names the offender.
named() {
    if report=$(sh "$house" "$copy" "$1" 2>&1); then
        return 1
    fi
    case $report in *"$2"*) return 0 ;; *) return 1 ;; esac
}

# bites RULE FILE LINE [OFFENDER]: appends the line to the file of the copy, tries the rule, and undoes it.
bites() {
    file=$copy/$2
    kept=no
    if [ -f "$file" ]; then
        cp "$file" "$copy.kept"
        kept=yes
    fi
    mkdir -p "$(dirname "$file")"
    printf '%b\n' "$3" >>"$file"
    count "$1 does not see $3 in $2" named "$1" "${4:-$2}"
    if [ "$kept" = yes ]; then
        mv "$copy.kept" "$file"
    else
        rm "$file"
    fi
}

bites rule_base_includes src/base/memory.h '#include "raddle/engine.h"'
bites rule_base_includes src/base/memory.h '#include "flow/pairs.h"'
bites rule_flow_includes src/flow/pairs.h '#include "broad/broad.h"'
bites rule_flow_has_no_code src/flow/pairs.c 'int rdli_one;'
bites rule_stage_includes src/broad/broad.h '#include "narrow/narrow.h"'
bites rule_stage_includes src/narrow/narrow.h '  #  include  <stdio.h>'
bites rule_stage_includes src/bounds/bounds.h '#include "driver/loop.h"'
bites rule_driver_includes src/driver/extra.c '#include "api/settings.h"'
bites rule_api_includes src/api/settings.h '#include "response/response.h"'
bites rule_shot_includes src/shot/extra.h '#include "flow/motion.h"'
bites rule_outsiders_see_public_headers_only tests/oracle/extra.c '#include "base/internal.h"'
bites rule_outsiders_see_public_headers_only tools/extra.c '#include "narrow/narrow.h"'
bites rule_exported_calls_live_in_api src/broad/extra.c 'int rdl_stray(void)\n{\n    return 0;\n}'
bites rule_public_headers_alone_in_c include/raddle/host.h 'typedef rdl_unknown_type rdl_other;'
bites rule_public_headers_alone_in_cxx include/raddle/host.h 'typedef int class;'
bites rule_inner_headers_alone src/base/memory.h 'typedef rdli_unknown_type rdli_other;'
bites rule_every_public_header_is_installed include/raddle/extra.h '#include "host.h"'
bites rule_top_level_names notes.md 'stray'
bites rule_files_are_short src/base/memory.c "$(yes '/* long */' | head -600)"
bites rule_functions_are_short src/base/memory.c "void rdli_f(void)\n{\n$(yes '    ;' | head -61)\n}"
bites rule_no_loose_arithmetic meson.build "add_project_arguments('-ffast-math', language: 'c')"
bites rule_no_unfinished_marks src/base/memory.c '/* TODO: finish */'
bites rule_no_machine_paths docs/errata.md 'see /home/somebody/raddle'
bites rule_no_tabs_or_trailing_blanks src/base/memory.c '\tint x;'
bites rule_no_tabs_or_trailing_blanks docs/errata.md 'blank at the end '
bites rule_scripts_are_clean tools/demo.sh "cd \$undefined_and_unquoted"
bites rule_readme_names_the_test_command .ci/run 'exec sh tools/other.sh' README.md
bites rule_one_version include/raddle/version.h '#define RDL_VERSION_TEXT "9.9.9"' meson.build
bites rule_links_lead_somewhere docs/errata.md '[gone](nowhere.md)'
bites rule_docs_are_indexed docs/lonely.md 'A page that nobody finds.'
bites rule_test_programs_are_in_the_build tests/unit/base/test_lonely.c 'int main(void) { return 0; }'

: "${CC:=cc}"
# library NAME CODE: a static library with that code.
library() {
    printf '%b\n' "$2" | "$CC" -std=c17 -O1 -x c -c - -o "$copy/$1.o"
    rm -f "$copy/lib$1.a"
    ar rcs "$copy/lib$1.a" "$copy/$1.o"
}
# refused NAME CODE: symbols.sh names the static library with that code as an offender.
refused() {
    library "$1" "$2"
    ! sh "$root/tests/meta/symbols.sh" "$copy/lib$1.a" >"$copy/report" && grep -q "^lib$1.a: " "$copy/report"
}
# accepted NAME CODE: it does not.
accepted() {
    library "$1" "$2"
    sh "$root/tests/meta/symbols.sh" "$copy/lib$1.a" >"$copy/report"
}
count 'symbols.sh accepts a plain library' accepted plain \
    'static const char *const t[] = {"a", "b"}; const char *rdl_a(int i) { return t[i]; }'
count 'symbols.sh sees a foreign name' refused foreign 'int stray(void) { return 0; }'
count 'symbols.sh sees a static counter' refused counter 'int rdl_next(void) { static int n; return n++; }'
count 'symbols.sh sees an initialised global' refused global 'int rdl_state = 3;'
count 'symbols.sh sees a print' refused print '#include <stdio.h>\nvoid rdl_a(int i) { printf("%d", i); }'
count 'symbols.sh sees an exit' refused ending '#include <stdlib.h>\nvoid rdl_a(void) { exit(1); }'

echo "$((100 * (checks - failures) / checks))%: Checks: $checks, Failures: $failures, Errors: 0"
[ "$failures" -eq 0 ]
