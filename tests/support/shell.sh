# SPDX-License-Identifier: GPL-3.0-or-later
# For tests written in shell; source it. Gives $scratch, an own folder that goes when the test ends.
set -euo pipefail
scratch=$(mktemp -d "${TMPDIR:-/tmp}/tonewalk-test.XXXXXX")
trap 'rm -rf -- "$scratch"' EXIT

fail() {
    printf 'FAILED: %s\n' "$*" >&2
    exit 1
}

# expect_status STATUS COMMAND...: runs it; its outputs are then in $scratch/stdout and $scratch/stderr.
expect_status() {
    local expected=$1 status=0
    shift
    "$@" >"$scratch/stdout" 2>"$scratch/stderr" || status=$?
    if [[ $status != "$expected" ]]; then
        cat -- "$scratch/stdout" "$scratch/stderr" >&2
        fail "$* ended with status $status, not $expected"
    fi
}

# expect_line stdout|stderr REGEX: the last expect_status left a line there that matches (extended).
expect_line() {
    grep -qE -- "$2" "$scratch/$1" || {
        cat -- "$scratch/$1" >&2
        fail "no line of $1 matches $2"
    }
}
