#!/bin/sh
# SPDX-License-Identifier: GPL-3.0-or-later
# Which lines and branches of src the tests run, and which refusals none of them provokes.
#
#   sh tests/branches.sh
#
# It builds in BUILD-branches without optimisation, runs the plain tests there with smaller samples
# (tests/run.sh), and sums up what gcov counted (tests/branches.awk). What each line did is then in
# BUILD-branches/gcov. Settings from the environment: BUILD, JOBS, MAKE, LEAST (of the branches taken, in % of
# those of a folder).
set -u

BUILD=${BUILD:-build}
folder=$BUILD-branches
[ ! -d "$folder" ] || find "$folder" -name '*.gcda' -exec rm -f {} + || exit 1
sh tests/run.sh branches || exit 1
# Guards against memory that is short are many: here each allocation fails once.
for program in test_short_memory test_lost_memory; do
    CK_DEFAULT_TIMEOUT=900 "$folder/tests/unit/$program" >"$folder/$program.log" || {
        cat "$folder/$program.log"
        exit 1
    }
done

rm -rf "$folder/gcov"
mkdir -p "$folder/gcov" || exit 1
for source in src/*/*.c; do
    gcov -b -c -t -o "$folder/${source%.c}.o" "$source" >"$folder/gcov/$(echo "$source" | tr / -).gcov" \
        2>"$folder/gcov.log" || {
        cat "$folder/gcov.log"
        exit 1
    }
done
awk -v least="${LEAST:-model 94,engine 95,tally 96}" -f tests/branches.awk "$folder"/gcov/*.gcov
