#!/bin/sh
# docs/settings.md is what the table of settings says today.
# Usage: sh tests/meta/settings.sh SETTINGS_PAGE_PROGRAM DOCS_SETTINGS_MD
set -eu
if "$1" | diff -u "$2" -; then
    echo '100%: Checks: 1, Failures: 0, Errors: 0'
else
    echo "docs/settings.md is stale: write it anew with tests/meta/settings_page"
    echo '0%: Checks: 1, Failures: 1, Errors: 0'
    exit 1
fi
