#!/bin/sh
# The rules of the house, checked on the source tree. Prints one line per broken rule and a closing line like Check's.
# Usage: sh tests/meta/house.sh ROOT [RULE...]      (rules: the functions below named rule_...)
# A rule prints offenders, one a line, and nothing where all is well.
set -eu

self=$(CDPATH='' cd -- "$(dirname -- "$0")" && pwd)/house.sh
cd "$1"
shift
: "${CC:=cc}" "${CXX:=c++}"

system_headers_of_stages='immintrin|gmp|stdatomic|stdlib'
plain_types='host|query|report|rest|scene|settings|status|tree|version'

# includes FOLDER: "file: target" for each include directive; a bare name is one of the file's own folder.
includes() {
    find "$1" -type f \( -name '*.c' -o -name '*.h' -o -name '*.inc' \) | sort | while read -r file; do
        sed -n 's/^[[:space:]]*#[[:space:]]*include[[:space:]]*\([<"][^>"]*\)[>"].*/\1/p' "$file" |
            sed "s|^|$file: |"
    done
}

# outside FOLDER PATTERN: includes of FOLDER that the extended pattern does not allow.
outside() {
    includes "$1" | grep -Ev ": ($2)\$" || true
}

rule_base_includes() {
    outside src/base '<[a-z0-9_/]+\.h|"base/.*|"[a-z0-9_]+\.(h|inc)|"raddle/(status|host|scene)\.h'
}

rule_flow_includes() {
    outside src/flow "\"(base|flow)/.*|\"[a-z0-9_]+\\.h|\"raddle/($plain_types)\\.h|<std(int|def|bool)\\.h"
}

rule_flow_has_no_code() {
    find src/flow -name '*.c'
}

rule_stage_includes() {
    for stage in intake bounds broad narrow response outcome; do
        outside "src/$stage" \
            "\"($stage|base|flow)/.*|\"[a-z0-9_]+\\.(h|inc)|\"raddle/($plain_types)\\.h|<($system_headers_of_stages)\\.h"
    done
}

rule_driver_includes() {
    outside src/driver \
        "\"(driver|intake|bounds|broad|narrow|response|outcome|base|flow)/.*|\"[a-z0-9_]+\\.h|\"raddle/($plain_types|engine|watch)\\.h|<(time|stdatomic)\\.h"
}

# Besides the driver: the argument checks of intake, and the narrow phase for the calls that need no engine.
rule_api_includes() {
    outside src/api '"(api|driver|base|flow)/.*|"intake/intake\.h|"narrow/narrow\.h|"[a-z0-9_]+\.h|"raddle/[a-z]+\.h|<fenv\.h'
}

rule_shot_includes() {
    outside src/shot '<[A-Za-z0-9_/]+\.h|"(shot|base)/.*|"[a-z0-9_]+\.h|"raddle/[a-z]+\.h'
}

rule_outsiders_see_public_headers_only() {
    for folder in tools docs/examples tests/oracle tests/scenes src/audit; do
        if [ -d "$folder" ]; then
            outside "$folder" "<[A-Za-z0-9_/]+\\.h|\"raddle/[a-z]+\\.h|\"[a-z0-9_/]+\\.h" |
                cat
            includes "$folder" |
                grep -E ': "(base|flow|intake|bounds|broad|narrow|response|outcome|driver|api|shot)/' || true
        fi
    done
}

# Public symbols are defined in api/ only (and those of shot files in shot/).
rule_exported_calls_live_in_api() {
    grep -rnE '^[a-z].*[ *(]rdl_[a-z_]+\(' src --include='*.c' |
        grep -vE '^src/(api|shot|audit)/|^[^:]*:[0-9]+:(static|typedef|extern) |;[[:space:]]*$' || true
}

# compile_alone COMPILER STANDARD LANGUAGE FOLDER OPTIONS: headers that do not compile alone, or not twice. A NAME_body.h or
# NAME_kernel.h is
# not a header but a text that is compiled once for each instruction set.
compile_alone() {
    hdf5_flags=$(pkg-config --cflags hdf5)
    find "$4" -name '*.h' ! -name '*_body.h' ! -name '*_kernel.h' | sort | while read -r header; do
        # shellcheck disable=SC2086
        printf '#include "%s"\n#include "%s"\n' "$PWD/$header" "$PWD/$header" |
            "$1" "-std=$2" -x "$3" -Wall -Wextra -Wpedantic -Werror -D_POSIX_C_SOURCE=200809L \
                -fsyntax-only -Iinclude -Isrc $hdf5_flags $5 - >/dev/null 2>&1 || echo "$header"
    done
}

rule_public_headers_alone_in_c() {
    compile_alone "$CC" c17 c include ''
}

rule_public_headers_alone_in_cxx() {
    compile_alone "$CXX" c++17 c++ include ''
}

rule_inner_headers_alone() {
    case $(uname -m) in
    x86_64) compile_alone "$CC" c17 c src '-mavx2' ;;
    *) compile_alone "$CC" c17 c src '' ;;
    esac
}

rule_every_public_header_is_installed() {
    for header in include/raddle/*.h; do
        grep -qF "'raddle/${header##*/}'" include/meson.build || echo "$header"
    done
}

rule_top_level_names() {
    for name in .[!.]* *; do
        case $name in
        .git | .ci | .clang-format | .gitignore | include | src | tests | fixtures | tools | docs) ;;
        meson.build | README.md | DEVELOPERS.md | LICENSE) ;;
        build | build-* | .cache | *.part | compile_commands.json) ;; # what .gitignore leaves out
        *) echo "$name" ;;
        esac
    done
}

# Files of ours: all text that is under version control, or would be.
texts() {
    find . -path './build*' -prune -o -path ./.git -prune -o -path ./.cache -prune -o -type f \
        \( -name '*.c' -o -name '*.h' -o -name '*.inc' -o -name '*.sh' -o -name '*.awk' -o -name '*.md' -o -name '*.txt' \
        -o -name '*.csv' -o -name meson.build -o -path './.ci/run' \) -print |
        sed 's|^\./||' | sort
}

# code_files: the same, less data and this file, which has to name what it forbids.
code_files() {
    texts | grep -vE '\.csv$|^tests/meta/(house|bites)\.sh$'
}

# among PATTERN: lines of code files that match; our file names hold no blanks.
among() {
    code_files | xargs grep -nHE -e "$1" || true
}

rule_files_are_short() {
    texts | grep -v '\.csv$' | xargs wc -l | awk '$2 != "total" && $1 > 600 { print $2 ": " $1 " lines" }'
}

# A function starts with { and ends with } in the first column.
rule_functions_are_short() {
    find src tools tests docs -name '*.c' | sort | xargs awk '
        FNR == 1 { first = 0 }
        /^\{/ { first = FNR }
        /^\}/ && first {
            if (FNR - first > 61) print FILENAME ":" first ": " FNR - first - 1 " lines"
            first = 0
        }'
}

rule_no_loose_arithmetic() {
    among '-ffast-math|-Ofast|-funsafe-math|-fassociative-math|-ffinite-math-only|-freciprocal-math|ffp-contract=(fast|on)|FP_CONTRACT ON'
}

rule_no_unfinished_marks() {
    among '\b(TODO|FIXME|XXX|HACK|TBD|WIP)\b|[Nn]ot (yet )?implemented'
}

rule_no_machine_paths() {
    among '(^|[^A-Za-z0-9._/-])/(work|home|root|Users)/|shared/design'
}

rule_no_tabs_or_trailing_blanks() {
    among "$(printf '\t')|[[:space:]]\$"
}

rule_scripts_are_clean() {
    if ! command -v shellcheck >/dev/null 2>&1; then
        echo 'shellcheck is missing'
        return 0
    fi
    shellcheck -f gcc tools/*.sh tests/meta/*.sh .ci/run || true
}

rule_readme_names_the_test_command() {
    command=$(sed -n 's/^exec //p' .ci/run | tail -n 1)
    [ -n "$command" ] || echo '.ci/run: no command'
    grep -qxF "    $command" README.md || echo "README.md: does not show: $command"
}

# version_of FILE PATTERN
rule_one_version() {
    meson=$(sed -n "s/.*version: '\([0-9.]*\)', license.*/\1/p" meson.build)
    text=$(sed -n 's/#define RDL_VERSION_TEXT "\(.*\)"/\1/p' include/raddle/version.h)
    numbers=$(sed -n 's/#define RDL_VERSION_M[AI][JN]OR \([0-9]*\)/\1./p; s/#define RDL_VERSION_PATCH \([0-9]*\)/\1/p' \
        include/raddle/version.h | tr -d '\n')
    [ "$meson" = "$text" ] && [ "$meson" = "$numbers" ] ||
        echo "meson.build $meson, version.h $text and $numbers"
    grep -qF "## $meson" docs/changelog.md || echo "docs/changelog.md: no section for $meson"
}

# Relative links of the documents lead somewhere.
rule_links_lead_somewhere() {
    texts | grep '\.md$' | while read -r file; do
        grep -oE '\]\([^)#]+' "$file" | sed 's/^](//' | grep -vE '^(https?|mailto):' | while read -r target; do
            [ -e "$(dirname "$file")/$target" ] || echo "$file: $target"
        done
    done
}

# Each page of docs/ can be reached from its index.
rule_docs_are_indexed() {
    find docs -name '*.md' ! -path docs/README.md | sort | while read -r file; do
        grep -qF "(${file#docs/})" docs/README.md || echo "$file"
    done
}

rule_test_programs_are_in_the_build() {
    find tests -name 'test_*.c' | sort | while read -r file; do
        name=$(basename "$file" .c)
        grep -qE "'(test_)?(${name#test_}|${name##*_})(\\.c)?'" "$(dirname "$file")/meson.build" 2>/dev/null || echo "$file"
    done
}

rules=$*
[ -n "$rules" ] || rules=$(sed -n 's/^\(rule_[a-z_]*\)().*/\1/p' "$self")
count=0
broken=0
for rule in $rules; do
    count=$((count + 1))
    offenders=$("$rule" 2>&1)
    if [ -n "$offenders" ]; then
        broken=$((broken + 1))
        printf 'broken: %s\n%s\n' "$rule" "$offenders"
    fi
done
echo "$((100 * (count - broken) / count))%: Checks: $count, Failures: $broken, Errors: 0"
[ "$broken" -eq 0 ]
