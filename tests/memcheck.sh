#!/bin/sh
# SPDX-License-Identifier: GPL-3.0-or-later
# Look for memory that is read before it is written, used after it was freed, or lost: the program under
# Valgrind's memcheck on the example models, and one test in which each allocation fails in turn.
#
#   sh tests/memcheck.sh
#
# Settings from the environment: BUILD, JOBS, MAKE. Nothing is left out of what memcheck finds, in
# libraries neither.
set -u

BUILD=${BUILD:-build}
JOBS=${JOBS:-2}
MAKE=${MAKE:-make}
leaks=definite,indirect,possible

if [ "${1:-}" = one ]; then
    # one WORK NAME COMMAND... : run it; what goes wrong is left in WORK/NAME.found
    work=$2
    name=$3
    shift 3
    valgrind --quiet --error-exitcode=99 --leak-check=full --show-leak-kinds="$leaks" \
        --errors-for-leak-kinds="$leaks" --log-file="$work/$name.log" "$@" \
        >"$work/$name.out" 2>&1 </dev/null
    status=$?
    [ "$status" = 0 ] && [ ! -s "$work/$name.log" ] && exit 0
    {
        echo "memcheck: $name, exit status $status:"
        sed -n '1,40p' "$work/$name.log"
        tail -n 5 "$work/$name.out"
    } >"$work/$name.found"
    exit 0
fi

"$MAKE" --no-print-directory -s -j"$JOBS" BUILD="$BUILD" all "$BUILD/tests/unit/test_study" || exit 1
work=$(mktemp -d "${TMPDIR:-/tmp}/tarry-memcheck-XXXXXX") || exit 1
trap 'rm -rf "$work"' EXIT
export CK_FORK=no CK_RUN_CASE="memory faults"
cat >"$work/small.yaml" <<'END'
tarry: 1
time: min
genes:
  vela:
    start: steady
    promoter: {shut: {lasts: {erlang: {steps: 2, mean: 1}}, then: {open: 1}}, open: {to: {shut: 1}, initiates: 1}}
    transcript: {stages: {nascent: 0.5}, half_life: 0.2}
signals: {spot: {of: vela.nascent, ramp: {from: 0, to: 1}}}
run: {settle: 15, until: 1, every: 1, lags: 1, cells: 1}
END
{
    echo "failing-allocations $BUILD/tests/unit/test_study"
    for model in models/*.yaml; do
        name=$(basename "$model" .yaml)
        echo "$name $BUILD/tarry run $model --cells 2 --keep 1 --threads 2 --quiet --out $work/$name"
    done
    echo "check $BUILD/tarry check models/two_state.yaml"
    echo "predict $BUILD/tarry predict $work/small.yaml --quiet --out $work/predicted"
} | xargs -P "$JOBS" -L 1 sh "$0" one "$work"
cat "$work"/*.found 2>/dev/null && exit 1
echo "memcheck: nothing found in $(find "$work" -name '*.log' | wc -l) programs"
