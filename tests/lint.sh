#!/bin/sh
# SPDX-License-Identifier: GPL-3.0-or-later
# Look for what compilers, analysers and a few rules of the project can find; and, running the program, what
# ThreadSanitizer and Valgrind see and how many instructions it takes.
#
#   sh tests/lint.sh [STEP...]    steps: text includes rules format shell cppcheck gcc clang library tidy
#                                  threads memory instructions
#
# All steps run, whatever earlier ones found; the exit status is 0 only where none found anything.
# Settings from the environment: BUILD, JOBS, MAKE.
set -u

BUILD=${BUILD:-build}
JOBS=${JOBS:-2}
MAKE=${MAKE:-make}
export LC_ALL=C

if git rev-parse --git-dir >/dev/null 2>&1; then
    files=$(git ls-files --cached --others --exclude-standard)
else
    files=$(find . -name 'build*' -prune -o -name .git -prune -o -type f -print | sed 's|^\./||')
fi

# pick PATTERN: the files whose path matches
pick() {
    for file in $files; do
        [ -f "$file" ] && printf '%s\n' "$file"
    done | grep -E "$1"
}

# none WHAT: standard input must be empty; what is there is shown under WHAT.
none() {
    found=$(cat)
    [ -n "$found" ] || return 0
    echo "$1:"
    printf '%s\n' "$found"
    return 1
}

# No blanks at ends of lines, no tabs but in Makefiles, one newline at the end, no carriage returns.
step_text() {
    status=0
    for file in $(pick '\.(c|h|sh|awk|js|md|ya?ml|csv)$|^(Makefile|\.ci/run|\.clang-.*|\.gitignore)$'); do
        grep -nH '[[:blank:]]$' "$file"
        grep -nH "$(printf '\r')" "$file"
        [ "$file" = Makefile ] || grep -nH "$(printf '\t')" "$file"
        [ ! -s "$file" ] || [ "$(tail -c 1 "$file" | wc -l)" = 1 ] || echo "$file: no newline at the end"
    done | none "blanks at ends of lines, tabs, carriage returns, missing newlines" || status=1
    return $status
}

# The list of files is words.
# shellcheck disable=SC2046
step_includes() {
    awk -f tests/includes.awk $(pick '\.[ch]$')
}

step_rules() {
    status=0
    # The loops of the bench stay as they were written; their hash is told with the timing.
    for file in $(pick '\.(c|h|sh|awk|js)$|^(Makefile|\.ci/run)$' | grep -v '^tests/bench/hand_loop\.c$'); do
        head -n 2 "$file" | grep -q 'SPDX-License-Identifier: GPL-3.0-or-later' || echo "$file"
    done | none "files without a line for the licence" || status=1
    sources='^(src|include)/.*\.[ch]$'
    pick "$sources" | xargs grep -nE '^[[:space:]]*#[[:space:]]*pragma omp.*reduction' |
        none "OpenMP reductions (their order, and so the last bit, would vary)" || status=1
    pick '\.(c|h|sh|awk|md)$|^Makefile$' | xargs grep -nE '\b(TO[D]O|FIX[M]E)\b' |
        none "unfinished work" || status=1
    pick "$sources" | xargs grep -nE '\bgsl_(matrix_c?alloc|vector_c?alloc|linalg_LU_decomp|linalg_exponential_ss) *\(' |
        none "functions of GSL that do not survive a lack of memory (base/matrix has others)" || status=1
    # What follows a point is the locale's, but %.0f has none. The program sets no locale.
    pick "$sources" | grep -vE '^src/(base/number\.c|cli/.*)$' |
        xargs grep -nE '"[^"]*%[-+ #0-9]*(\.[0-9*]*)?l?([eEgGaA]|[fF])' | sed 's/%%//g; s/%\.0f//g' |
        grep -E '%[-+ #0-9]*(\.[0-9*]*)?l?[eEfFgGaA]' |
        none "numbers with a point written outside base/number" || status=1
    return $status
}

step_format() {
    pick '\.[ch]$' | xargs clang-format --dry-run -Werror
}

step_shell() {
    pick '\.sh$|^\.ci/run$' | xargs shellcheck -x
}

# Left out: conversions out of range, which are for the sanitizers, since the check does not see what
# guards them; and shifts of signed numbers to the right, which compilers do as the code expects.
step_cppcheck() {
    pick '\.c$' | xargs cppcheck --quiet --std=c11 --enable=warning,performance,portability \
        --inline-suppr --suppress=missingIncludeSystem --suppress=floatConversionOverflow \
        --suppress=shiftTooManyBitsSigned --error-exitcode=1 -j"$JOBS" \
        -Iinclude -Isrc -Itests/unit
}

compile() {
    "$MAKE" --no-print-directory -s -k -j"$JOBS" BUILD="$BUILD-lint-$1" CC="$1" \
        CFLAGS="-O2 -g -Werror" everything
}

step_gcc() {
    compile gcc
}

step_clang() {
    compile clang
}

# What the library promises not to do, seen in what it links to: it never prints, exits or reads the
# clock, touches files and reads numbers in one place each, and has no data that can change.
step_library() {
    status=0
    folder=$BUILD-lint-gcc
    "$MAKE" --no-print-directory -s -j"$JOBS" BUILD="$folder" CC=gcc CFLAGS="-O2 -g -Werror" \
        "$folder/libtarry.a" || return 1
    nm -A -u "$folder/libtarry.a" | sed 's/^[^:]*://; s/: *U / /' >"$folder/calls"
    awk '$2 ~ /^(v?f?printf|puts|putchar|putc|fputs|fputc|fwrite|perror|stdout|stderr|exit|_exit|abort|time|clock|clock_gettime|gettimeofday|omp_get_wtime|setlocale|srand|rand|random|system|signal|sigaction)$/' \
        "$folder/calls" | none "the library prints, exits, reads the clock or changes the process" ||
        status=1
    awk '$1 != "file.o" && $2 ~ /^(fopen|fdopen|freopen|open|openat|creat|opendir|read|write|rename|unlink|remove|mkdir|rmdir|stat|lstat|mkstemp|tmpfile)$/' \
        "$folder/calls" | none "files are touched outside base/file" || status=1
    awk '$1 != "number.o" && $2 ~ /^(strtod|strtof|strtold|atof|__isoc99_sscanf|sscanf)$/' \
        "$folder/calls" | none "numbers are read outside base/number" || status=1
    awk '$1 != "plotter.o" && $2 ~ /^(fork|vfork|posix_spawnp?|exec[lv][pe]*|popen|waitpid|kill)$/' \
        "$folder/calls" | none "programs are started outside report/plotter" || status=1
    # Locks of OpenMP's critical sections are not data.
    objdump -t "$folder/libtarry.a" | awk '
        /file format/ { object = $1 }
        NF >= 3 && $(NF - 2) ~ /^(\.t?data|\.t?bss|\*COM\*)/ && $(NF - 2) !~ /^\.data\.rel\.ro/ &&
            $(NF - 1) !~ /^0+$/ && $NF !~ /^\.gomp_critical/ { print object, $NF, $(NF - 2) }' |
        none "data that can change" || status=1
    return $status
}

step_tidy() {
    pick '^src/.*\.c$' | xargs -n 3 -P "$JOBS" sh -c '
        clang-tidy --quiet "$@" -- -std=c11 -D_POSIX_C_SOURCE=200809L -fopenmp -Iinclude -Isrc 2>&1 |
            grep -vE "^[0-9]+ warnings? (generated|treated)|^Suppressed" ; :' sh |
        none "clang-tidy"
}

step_threads() {
    sh tests/tsan.sh
}

step_memory() {
    sh tests/memcheck.sh
}

step_instructions() {
    sh tests/instructions.sh
}

[ $# -gt 0 ] || set -- text includes rules format shell cppcheck gcc clang library tidy threads memory \
    instructions
failed=
for step in "$@"; do
    start=$(date +%s)
    if "step_$step"; then
        echo "lint $step: nothing found ($(($(date +%s) - start)) s)"
    else
        echo "lint $step: FAILED ($(($(date +%s) - start)) s)"
        failed="$failed $step"
    fi
done
if [ -n "$failed" ]; then
    echo "lint failed:$failed"
    exit 1
fi
echo "lint passed"
