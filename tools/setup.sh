#!/bin/sh
# Installs the Debian packages of tools/packages.txt that are missing, and nothing else.
# Usage: sh tools/setup.sh build|test      (build: library, program and demo; test: the tests as well)
set -eu

need=${1:-test}
case $need in
build | test) ;;
*)
    echo "usage: sh tools/setup.sh build|test" >&2
    exit 2
    ;;
esac
here=$(CDPATH='' cd -- "$(dirname -- "$0")" && pwd)

if ! command -v dpkg-query >/dev/null 2>&1 || ! command -v apt-get >/dev/null 2>&1; then
    echo "setup: this is not a Debian system; install what tools/packages.txt lists by hand" >&2
    exit 0
fi

missing=''
while read -r package who rest; do
    case $package in '' | '#'*) continue ;; esac
    if [ "$who" = test ] && [ "$need" = build ]; then
        continue
    fi
    state=$(dpkg-query -W -f='${db:Status-Status}' "$package" 2>/dev/null || true)
    case $state in
    *not-installed*) missing="$missing $package" ;;
    *installed*) ;;
    *) missing="$missing $package" ;;
    esac
done <"$here/packages.txt"

if [ -z "$missing" ]; then
    exit 0
fi

if [ "$(id -u)" -eq 0 ]; then
    as_root=''
elif command -v sudo >/dev/null 2>&1; then
    as_root=sudo
else
    echo "setup: these packages are missing, and there is neither root nor sudo to install them:$missing" >&2
    exit 1
fi

# apt_get ARGUMENTS: three tries, since mirrors are sometimes busy for a moment.
apt_get() {
    for pause in 5 15 0; do
        if $as_root env DEBIAN_FRONTEND=noninteractive apt-get -q -y "$@" </dev/null; then
            return 0
        fi
        sleep "$pause"
    done
    return 1
}

echo "setup: installing$missing"
log=$(mktemp)
trap 'rm -f "$log"' EXIT
# The list holds package names without blanks, to be split here.
# shellcheck disable=SC2086
if ! { apt_get update && apt_get install --no-install-recommends $missing; } >"$log" 2>&1; then
    cat "$log" >&2
    echo "setup: apt-get failed" >&2
    exit 1
fi
