#!/bin/sh
# SPDX-License-Identifier: GPL-3.0-or-later
# Try the program on every case of this folder, and run its scripts.
#
#   sh tests/cli/run.sh [NAME...]    NAME.case or NAME.sh; default: all of them
#
# TARRY is the program (default build/tarry). A file NAME.case is one case:
#
#   what it is about
#   command: run model.yaml --cells 3     words after `tarry`, quoted as for the shell
#   exit: 2
#   --- error
#   a text that must stand on standard error, one a line
#   --- model.yaml
#   a file that is there when the command runs; there may be several
#
# Cases are about what is refused: nothing may stand on standard output and no file may come, go or
# change. Scripts print a line `ok NAME` or `not ok NAME` for each of their cases, or `skipped: WHY`. The last line here
# is "N passed, N failed", and the exit status is 0 only where nothing failed.
set -u

here=$(cd "${0%/*}" && pwd) || exit 1
TARRY=${TARRY:-build/tarry}
case $TARRY in
/*) ;;
*) TARRY=$PWD/$TARRY ;;
esac
export TARRY
if [ ! -x "$TARRY" ]; then
    echo "run.sh: $TARRY is no program; build it, or name it in TARRY" >&2
    exit 1
fi
work=$(mktemp -d "${TMPDIR:-/tmp}/tarry-cases-XXXXXX") || exit 1
trap 'rm -rf "$work"' EXIT
passed=0
failed=0

# split CASE: its head into $work/head, its files into $work/files, what is expected into
# $work/error
split() {
    rm -rf "$work/files" && mkdir "$work/files" || return 1
    : >"$work/head" && : >"$work/error" || return 1
    awk -v work="$work" '
        /^--- / {
            file = $2 == "error" ? work "/error" : work "/files/" $2
            printf "" >file
            next
        }
        { print >(file ? file : work "/head") }' "$1"
}

# Names, sizes and sums of all that is in the folder of the case.
inventory() {
    (cd "$work/files" && find . -print | sort && find . -type f -exec cksum {} +)
}

# try CASE: what is wrong goes to standard output; true where nothing is
try() {
    split "$1" || return 1
    command=$(sed -n 's/^command: //p' "$work/head")
    wanted=$(sed -n 's/^exit: //p' "$work/head")
    if [ -z "$command" ] || [ -z "$wanted" ] || [ ! -s "$work/error" ]; then
        echo "    a case needs 'command:', 'exit:' and '--- error'"
        return 1
    fi
    inventory >"$work/before"
    # What is refused is refused in less than a second and with little memory. (Sanitizers take more of both. -t
    # and -v are no part of the standard, but of every shell that is /bin/sh somewhere.)
    # shellcheck disable=SC3045
    (
        [ -n "${TARRY_TEST_SMALL:-}" ] || { ulimit -t 1 && ulimit -v 1000000; }
        cd "$work/files" && eval "\"\$TARRY\" $command"
    ) >"$work/out" 2>"$work/err" </dev/null
    status=$?
    inventory >"$work/after"
    good=true
    if [ "$status" != "$wanted" ]; then
        echo "    exit status $status instead of $wanted"
        good=false
    fi
    while IFS= read -r text; do
        grep -qF -e "$text" "$work/err" && continue
        echo "    does not say: $text"
        good=false
    done <"$work/error"
    if [ -s "$work/out" ]; then
        echo "    something stands on standard output"
        good=false
    fi
    if ! cmp -s "$work/before" "$work/after"; then
        echo "    files came, went or changed"
        good=false
    fi
    $good || sed 's/^/    said: /' "$work/err"
    $good
}

run_case() {
    if try "$1" >"$work/wrong"; then
        passed=$((passed + 1))
        return
    fi
    failed=$((failed + 1))
    echo "not ok $(basename "$1" .case): $(head -n 1 "$1")"
    cat "$work/wrong"
}

# A script that ends badly though no case of it failed has failed too.
run_script() {
    sh "$1" >"$work/script" 2>&1
    status=$?
    good=$(grep -c '^ok ' "$work/script")
    bad=$(grep -c '^not ok ' "$work/script")
    [ "$status" = 0 ] || [ "$bad" != 0 ] || bad=1
    [ "$((good + bad))" != 0 ] || grep -q "^skipped: " "$work/script" || bad=1
    [ "$bad" = 0 ] || {
        echo "$(basename "$1"), exit status $status:"
        grep -v '^ok ' "$work/script"
    }
    passed=$((passed + good))
    failed=$((failed + bad))
}

if [ $# = 0 ]; then
    set -- "$here"/*.case "$here"/*.sh
fi
for file in "$@"; do
    case $file in
    */*) ;;
    *) file=$here/$file ;;
    esac
    case $file in
    */run.sh | */helpers.sh) ;;
    *.case) run_case "$file" ;;
    *.sh) run_script "$file" ;;
    *)
        echo "run.sh: $file is neither a case nor a script" >&2
        exit 1
        ;;
    esac
done
echo "$passed passed, $failed failed"
[ "$failed" = 0 ] && [ "$passed" != 0 ]
