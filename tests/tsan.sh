#!/bin/sh
# SPDX-License-Identifier: GPL-3.0-or-later
# Look for data races: the program under ThreadSanitizer, with four threads, on the example models, whole
# and interrupted.
#
#   sh tests/tsan.sh
#
# Settings from the environment: BUILD, JOBS, MAKE, CLANG. It builds in BUILD-tsan, with clang; threads are
# POSIX threads there as everywhere, so that the sanitizer sees all that passes between them.
set -u

BUILD=${BUILD:-build}
JOBS=${JOBS:-2}
MAKE=${MAKE:-make}
folder=$BUILD-tsan
"$MAKE" --no-print-directory -s -j"$JOBS" BUILD="$folder" CC="${CLANG:-clang}" \
    CFLAGS="-O1 -g -fsanitize=thread" all || exit 1

program=$PWD/$folder/tarry
models=$PWD/models
work=$(mktemp -d "${TMPDIR:-/tmp}/tarry-tsan-XXXXXX") || exit 1
trap 'rm -rf "$work"' EXIT
cd "$work" || exit 1
export TSAN_OPTIONS="exitcode=66 halt_on_error=1"

# Where the system strews memory too widely for the sanitizer, it is asked not to.
plain=
"$program" version >/dev/null 2>&1 || plain="setarch -R"

# expect STATUS NAME COMMAND... : the command ends with this status; else what it said is shown
expect() {
    wanted=$1
    name=$2
    shift 2
    "$@" >out 2>err
    status=$?
    [ "$status" = "$wanted" ] && return
    echo "thread sanitizer: $name ended with $status instead of $wanted:"
    sed -n '1,40p' err
    exit 1
}

n=0
for model in "$models"/*.yaml; do
    name=$(basename "$model" .yaml)
    # Beyond 64 cells one waits for another of its group.
    case $name in
    binding | two_state) cells=70 ;;
    *) cells=6 ;;
    esac
    # $plain is words.
    # shellcheck disable=SC2086
    expect 0 "$name" $plain "$program" run "$model" --cells "$cells" --keep 5 --threads 4 --out "$name" \
        --quiet
    n=$((n + 1))
done
# shellcheck disable=SC2086
expect 3 "an interrupted run" timeout --foreground --preserve-status -s INT 1 $plain "$program" run \
    "$models/two_state.yaml" --cells 1000000 --threads 4 --out partial
echo "thread sanitizer: no race in runs of $n models and an interrupted one"
