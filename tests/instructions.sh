#!/bin/sh
# SPDX-License-Identifier: GPL-3.0-or-later
# Count the instructions that an event of the bench takes (a firing or a completion), which unlike its
# time is the same on every run, and compare with what is stored.
#
#   sh tests/instructions.sh [store]
#
# tests/bench/instructions holds the figures and what they were counted with: compiler, C library and
# processor (the C library has several versions of exp and log). A figure may be off by 3 % either way:
# slower is a defect or has a reason, faster is to be kept, and `store` stores the figures of now. With
# another compiler, library or processor the figures are compared with that of a loop written by hand,
# as a ratio, which may be off by 15 %.
#
# Settings from the environment: BUILD, JOBS, MAKE.
set -u

BUILD=${BUILD:-build}
JOBS=${JOBS:-2}
MAKE=${MAKE:-make}
export LC_ALL=C
folder=$BUILD-lint-gcc
stored=tests/bench/instructions

if [ "${1:-}" = one ]; then
    # one PROGRAM WORK CASE WHAT : a line "CASE WHAT instructions-per-event"
    events=$(valgrind --tool=callgrind --callgrind-out-file=/dev/null --toggle-collect="time_$5" \
        "$2" count "$4" "$5" 2>"$3/$4-$5.log")
    awk -v case="$4" -v what="$5" -v events="$events" \
        '/Collected :/ && events > 0 { printf "%s %s %.2f\n", case, what, $NF / events }' \
        "$3/$4-$5.log" >"$3/$4-$5.count"
    exit 0
fi

"$MAKE" --no-print-directory -s -j"$JOBS" BUILD="$folder" CC=gcc CFLAGS="-O2 -g -Werror" \
    "$folder/bench" || exit 1
work=$(mktemp -d "${TMPDIR:-/tmp}/tarry-count-XXXXXX") || exit 1
trap 'rm -rf "$work"' EXIT

processor=$(sed -n '/^flags/{p;q;}' /proc/cpuinfo 2>/dev/null | tr ' ' '\n' |
    grep -xE 'fma|avx2' | sort | tr '\n' ' ')
with="gcc $(gcc -dumpfullversion), $(ldd --version 2>&1 | sed -n '1s/.* /libc /p'), $(uname -m) ${processor% }"
printf '%s\n' "a hand" "b hand" "a bare" "a tallied" "b bare" "c bare" "d bare" |
    xargs -P "$JOBS" -L 1 sh "$0" one "$folder/bench" "$work"
{
    echo "# Instructions per event: case of the bench, what, figure. See tests/instructions.sh."
    echo "# $with"
    cat "$work"/*.count
} >"$work/now"

if [ "${1:-}" = store ]; then
    cp "$work/now" "$stored"
    cat "$stored"
    exit
fi

awk -v with="# $with" '
    /^#/ { if (FNR == 2 && NR == FNR) { same = $0 == with; stored_with = $0 } next }
    NR == FNR { was[$1 " " $2] = $3; next }
    { is[$1 " " $2] = $3 }
    END {
        unit_was = unit_is = 1
        limit = 0.03
        if (!same) {
            print "counted with other tools than the stored figures (" substr(stored_with, 3) "),"
            print "so ratios to the loop by hand of case a are compared, within 15 %"
            unit_was = was["a hand"]
            unit_is = is["a hand"]
            limit = 0.15
        }
        n = bad = 0
        for (name in was) {
            n++
            if (!(name in is)) { print name ": not counted"; bad++; continue }
            old = was[name] / unit_was
            new = is[name] / unit_is
            off = new / old - 1
            if (off < -limit || off > limit) {
                bad++
                printf "%s: %.2f instructions per event, %+.1f %% off the stored %.2f\n", name,
                    is[name], 100 * off, was[name]
            }
        }
        if (bad) {
            print "find out why; where it is meant, `sh tests/instructions.sh store`"
            exit 1
        }
        if (n < 7) { print "figures are missing in the file"; exit 1 }
    }' "$stored" "$work/now" || exit 1
sed -n 's/^\([a-d]\) \(bare\) \(.*\)/\1 \3/p' "$work/now" | tr '\n' ' ' |
    sed 's/^/instructions per event, bare: /; s/ $/\n/'
