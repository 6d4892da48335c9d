#!/bin/sh
# SPDX-License-Identifier: GPL-3.0-or-later
# Build and run the tests, two programs at a time, and sum up.
#
#   sh tests/run.sh PART...    parts: plain, sanitized, slow, branches
#
# plain      unit tests, tests against outside sources, the example, cases of the command line
# sanitized  the same with smaller samples under AddressSanitizer and UndefinedBehaviorSanitizer
# slow       programs tests/*/slow_*.c, which take longer
# branches   the plain tests with smaller samples, built for gcov (tests/branches.sh)
#
# Settings from the environment: BUILD, JOBS, MAKE. What each program says is kept in
# BUILD/test-logs. The last line is "N passed, N failed"; what failed is told before it, and the exit
# status is 0 only where nothing did.
set -u

BUILD=${BUILD:-build}
JOBS=${JOBS:-2}
MAKE=${MAKE:-make}
sanitizers="-O1 -g -fno-omit-frame-pointer -fno-sanitize-recover=all -fsanitize=address,undefined,float-cast-overflow"

if [ "${1:-}" = run-one ]; then
    # run-one LOGS PROGRAM: run one program; LOGS/NAME.log and a line in LOGS/NAME.count come of it.
    logs=$2
    program=$3
    name=$(basename "$program")
    start=$(date +%s)
    "$program" >"$logs/$name.log" 2>&1 </dev/null
    status=$?
    seconds=$(($(date +%s) - start))
    # The last summary of libcheck, else one check: the exit status. A program that ends badly though
    # every check passed has failed too.
    awk -v status="$status" -v name="$name" -v seconds="$seconds" '
        /^[0-9]+%: Checks: [0-9]+, Failures: [0-9]+, Errors: [0-9]+$/ {
            gsub(/[^0-9 ]/, "")
            checks = $2; bad = $3 + $4; seen = 1
        }
        END {
            if (!seen) { checks = 1; bad = 0 }
            if (status != 0 && bad == 0) { bad = 1; if (seen) checks++ }
            printf "%d %d %s (%d s)\n", checks - bad, bad, name, seconds
        }' "$logs/$name.log" >"$logs/$name.count"
    awk '{ printf "%s %s: %d passed, %d failed, %s %s\n", $2 ? "FAILED" : "ok    ", $3, $1, $2, $4, $5 }' \
        "$logs/$name.count" | tr -d '()'
    exit 0
fi

# run_programs LOGS, with the programs on standard input, the longest known first
run_programs() {
    CK_VERBOSITY=normal xargs -n 1 -P 2 sh "$0" run-one "$1"
}

# Cases of the command line for one build; their last line is "N passed, N failed".
run_cli() {
    [ -f tests/cli/run.sh ] || return 0
    start=$(date +%s)
    TARRY=$1/tarry BUILD=$1 sh tests/cli/run.sh >"$2/cli.log" 2>&1 </dev/null
    status=$?
    tail -n 1 "$2/cli.log" | awk -v status="$status" -v seconds="$(($(date +%s) - start))" '
        /^[0-9]+ passed, [0-9]+ failed$/ { good = $1; bad = $3; seen = 1 }
        END {
            if (status != 0 && bad == 0 || !seen) bad++
            printf "%d %d cli (%d s)\n", good, bad, seconds
            printf "%s cli: %d passed, %d failed, %d s\n", bad ? "FAILED" : "ok    ", good, bad,
                seconds >"/dev/stderr"
        }' >"$2/cli.count"
}

# build_and_run PART BUILD GOALS LIST [make arguments]
build_and_run() {
    part=$1
    folder=$2
    goals=$3
    list=$4
    shift 4
    logs=$BUILD/test-logs/$part
    rm -rf "$logs"
    mkdir -p "$logs"
    echo "== $part"
    # Goals are a list of words.
    # shellcheck disable=SC2086
    if ! "$MAKE" --no-print-directory -s -j"$JOBS" BUILD="$folder" "$@" $goals; then
        echo "0 1 build ($part does not build)" >"$logs/build.count"
        return
    fi
    "$MAKE" --no-print-directory -s BUILD="$folder" "$list" | sed "/^\$/d;${LEAVE_OUT:+/$LEAVE_OUT/d}" >"$logs/programs"
    run_programs "$logs" <"$logs/programs"
    [ "$part" = slow ] || run_cli "$folder" "$logs"
}

# What a program said when it failed: libcheck's lines, else its last ones.
tell_failures() {
    for count in "$BUILD"/test-logs/*/*.count; do
        read -r _ bad name rest <"$count"
        [ "$bad" != 0 ] || continue
        log=${count%.count}.log
        echo "FAILED: $log $rest"
        [ -f "$log" ] || continue
        grep -E ':[FE]:|^FAIL|ERROR: (Address|Leak)Sanitizer|runtime error:' "$log" | head -n 40 |
            grep . || tail -n 40 "$log"
    done
}

export CK_DEFAULT_TIMEOUT="${CK_DEFAULT_TIMEOUT:-180}"
rm -rf "$BUILD/test-logs"
for part in "$@"; do
    case $part in
    plain)
        build_and_run plain "$BUILD" "all tests" list-tests
        ;;
    sanitized)
        export TARRY_TEST_SMALL=1 CK_DEFAULT_TIMEOUT=240
        export ASAN_OPTIONS=allocator_may_return_null=1:detect_stack_use_after_return=1
        export UBSAN_OPTIONS=print_stacktrace=1
        build_and_run sanitized "$BUILD-asan" "all tests" list-tests CFLAGS="$sanitizers"
        unset TARRY_TEST_SMALL ASAN_OPTIONS UBSAN_OPTIONS
        ;;
    branches)
        # What a killed program has counted may be half written. Threads count in turn.
        export TARRY_TEST_SMALL=1 CK_DEFAULT_TIMEOUT=900 LEAVE_OUT=test_killed
        build_and_run branches "$BUILD-branches" "all tests" list-tests CC=gcc \
            CFLAGS="-O0 -g --coverage -fprofile-update=atomic"
        unset TARRY_TEST_SMALL LEAVE_OUT
        ;;
    slow)
        export CK_DEFAULT_TIMEOUT=1800
        build_and_run slow "$BUILD" "all tests-slow" list-tests-slow
        ;;
    *)
        echo "run.sh: there is no part $part; parts are plain, sanitized, slow, branches" >&2
        exit 2
        ;;
    esac
done

tell_failures
cat "$BUILD"/test-logs/*/*.count | awk '
    { good += $1; bad += $2 }
    END {
        if (good + bad == 0) bad = 1
        printf "%d passed, %d failed\n", good, bad
        exit bad != 0
    }'
