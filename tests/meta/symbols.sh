#!/bin/sh
# What the built libraries export, call and keep. For builds without sanitizers, whose run-time adds symbols.
# Usage: sh tests/meta/symbols.sh SHARED_OR_STATIC_LIBRARY...
set -eu

checks=0
failures=0

# judge NAME OFFENDERS
judge() {
    checks=$((checks + 1))
    if [ -n "$2" ]; then
        failures=$((failures + 1))
        printf '%s:\n%s\n' "$1" "$2"
    fi
}

for library in "$@"; do
    base=${library##*/}
    case $library in
    *.a)
        judge "$base: global symbols begin with rdl_ or rdli_" \
            "$(nm -g --defined-only "$library" | awk 'NF == 3 && $3 !~ /^rdli?_/ { print $3 }')"
        # Tables of constant pointers are relocated into .data.rel.ro and read-only afterwards.
        judge "$base: keeps no global state" \
            "$(objdump -t "$library" | awk '$0 ~ / O / && $0 ~ / \.(data|bss|tdata|tbss)(\.[a-zA-Z_]|[\t ])/ &&
                $0 !~ /\.data\.rel\.ro/ { print $NF }')"
        # With assertions on, a failed one ends the process: that is what they are for, and releases have none.
        judge "$base: neither prints nor ends the process, and changes nothing process-wide" \
            "$(nm -u "$library" | awk '{ print $NF }' | grep -xE \
                'v?f?printf|(__)?v?f?printf_chk|puts|fputs|putchar|perror|stdout|stderr|abort|_?exit|_Exit|quick_exit|atexit|raise|kill|signal|sigaction|setlocale|setenv|putenv|srand|rand|srandom|random|strtok|longjmp|system' || true)"
        ;;
    *)
        judge "$base: exported symbols begin with rdl_" \
            "$(nm -D --defined-only "$library" | awk 'NF == 3 && $3 !~ /^rdl_/ { print $3 }')"
        judge "$base: exports something" \
            "$(nm -D --defined-only "$library" | grep -q ' T rdl_' || echo nothing)"
        ;;
    esac
done
echo "$((100 * (checks - failures) / checks))%: Checks: $checks, Failures: $failures, Errors: 0"
[ "$failures" -eq 0 ]
