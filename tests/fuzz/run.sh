#!/bin/sh
# SPDX-License-Identifier: GPL-3.0-or-later
# Let libFuzzer look for inputs that break a reader.
#
#   sh tests/fuzz/run.sh BUILD SECONDS TARGET...
#
# Each target runs for SECONDS, two at a time, from its corpus in tests/fuzz/corpus and what earlier runs
# found (BUILD/corpus). An input that breaks one is left in BUILD as found-TARGET-..., and the exit status
# is 1. At the end stands how many inputs were tried.
set -u

build=$1
seconds=$2
shift 2

# fuzz TARGET
fuzz() {
    mkdir -p "$build/corpus/$1"
    "$build/fuzz_$1" -max_total_time="$seconds" -print_final_stats=1 -timeout=10 -rss_limit_mb=2048 \
        -max_len=4096 -dict="tests/fuzz/$1.dict" -artifact_prefix="$build/found-$1-" \
        "$build/corpus/$1" "tests/fuzz/corpus/$1" >"$build/$1.log" 2>&1
    echo $? >"$build/$1.status"
}

status=0
total=0
while [ $# -gt 0 ]; do
    pair="$1 ${2:-}"
    for target in $pair; do
        fuzz "$target" &
    done
    wait
    for target in $pair; do
        shift
        tried=$(sed -n 's/^stat::number_of_executed_units: *//p' "$build/$target.log")
        total=$((total + ${tried:-0}))
        if [ "$(cat "$build/$target.status")" = 0 ]; then
            echo "$target: ${tried:-0} inputs, none breaks it"
        else
            status=1
            echo "$target: broken after ${tried:-0} inputs; the input and what was said:"
            ls "$build/found-$target-"* 2>/dev/null
            grep -E 'ERROR|fuzz: |SUMMARY|runtime error' "$build/$target.log" | head -n 5
        fi
    done
done
echo "$total inputs"
exit $status
