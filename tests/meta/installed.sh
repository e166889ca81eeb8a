#!/bin/sh
# Installs into an empty folder and builds every example of docs/examples against it with nothing but pkg-config: as C17
# with the shared and with the static library, and the headers as C++17 where there is a C++ compiler. An example
# NAME.c is run, and must print NAME.txt where that file exists.
# Usage: sh tests/meta/installed.sh SOURCE_FOLDER BUILD_FOLDER
set -eu

source=$1
build=$2
: "${CC:=cc}" "${CXX:=c++}"
checks=0
failures=0
work=$(mktemp -d "$build/installed.XXXXXX")
trap 'rm -rf "$work"' EXIT

# judge NAME COMMAND...: one check that passes when the command succeeds. Inside, `set -e` has no effect.
judge() {
    checks=$((checks + 1))
    name=$1
    shift
    if ! "$@" >"$work/log" 2>&1; then
        failures=$((failures + 1))
        echo "failed: $name"
        cat "$work/log"
    fi
}

# flags PACKAGE OPTIONS: what pkg-config says, with the prefix moved into the stage.
flags() {
    package=$1
    shift
    pkg-config --define-variable=prefix="$stage$prefix" "$@" "$package"
}

# example FILE PACKAGE KIND: compiles and runs one example.
example() {
    program=$work/$(basename "$1" .c)-$3
    # Flags and paths of pkg-config, to be split here; the stage is reached by a link whose path has no blanks.
    # shellcheck disable=SC2046
    if [ "$3" = static ]; then
        "$CC" -std=c17 -Wall -Wextra -Wpedantic -Werror "$1" -o "$program" $(flags "$2" --cflags --libs --static) || return 1
    else
        "$CC" -std=c17 -Wall -Wextra -Wpedantic -Werror "$1" -o "$program" $(flags "$2" --cflags --libs) || return 1
    fi
    (cd "$work" && LD_LIBRARY_PATH=$stage$libdir "$program" >"$program.out") || return 1
    if [ -f "${1%.c}.txt" ]; then
        diff -u "${1%.c}.txt" "$program.out"
    fi
}

# needs_only_static PROGRAM: the program does not ask for a shared library of ours.
needs_only_static() {
    ! objdump -p "$1" | grep 'NEEDED.*libraddle'
}

cxx_headers() {
    # shellcheck disable=SC2046
    for header in "$stage$prefix"/include/raddle/*.h; do
        printf '#include <raddle/%s>\nint main() { return 0; }\n' "${header##*/}" |
            "$CXX" -std=c++17 -Wall -Wextra -Wpedantic -Werror -x c++ -fsyntax-only $(flags raddle --cflags) - || return 1
    done
}

# Compilers split what pkg-config prints at blanks, so the stage is named by a link without any.
mkdir "$work/stage"
lane=$(mktemp -d)
trap 'rm -rf "$work" "$lane"' EXIT
ln -s "$work/stage" "$lane/stage"
stage=$lane/stage

judge 'meson install' meson install -C "$build" --no-rebuild --destdir "$work/stage"
pc=$(find "$work/stage" -name raddle.pc)
judge 'raddle.pc is installed' test -n "$pc"
prefix=$(sed -n 's/^prefix=//p' "$pc")
PKG_CONFIG_PATH=$stage${pc#"$work/stage"}
PKG_CONFIG_PATH=${PKG_CONFIG_PATH%/*}
export PKG_CONFIG_PATH
libdir=$(pkg-config --variable=libdir raddle)
judge 'pkg-config knows the version' pkg-config --exact-version="$(sed -n 's/^Version: //p' "$pc")" raddle

for file in "$source"/docs/examples/*.c; do
    [ -f "$file" ] || continue
    package=raddle
    if grep -qE 'raddle/(shot|recorder)\.h' "$file"; then
        package=raddle_shot
    fi
    judge "${file##*/} with the shared library" example "$file" "$package" shared
done
find "$work/stage" -name 'libraddle*.so*' -exec rm {} +
for file in "$source"/docs/examples/*.c; do
    [ -f "$file" ] || continue
    package=raddle
    if grep -qE 'raddle/(shot|recorder)\.h' "$file"; then
        package=raddle_shot
    fi
    judge "${file##*/} with the static library" example "$file" "$package" static
    judge "${file##*/} is linked statically" needs_only_static "$work/$(basename "$file" .c)-static"
done
if command -v "$CXX" >/dev/null 2>&1; then
    judge 'headers as C++17' cxx_headers
fi

echo "$((100 * (checks - failures) / checks))%: Checks: $checks, Failures: $failures, Errors: 0"
[ "$failures" -eq 0 ]
