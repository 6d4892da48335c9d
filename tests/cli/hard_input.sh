#!/bin/sh
# SPDX-License-Identifier: GPL-3.0-or-later
# shellcheck disable=SC2317 # cases are functions, called by name
# Files that are no models, or hardly: each is refused in less than a second of work and with little memory, and
# nothing is written. And a locale with a decimal comma changes nothing.
# shellcheck source=tests/cli/helpers.sh
. "${0%/*}/helpers.sh"

small_model >small.yaml

# refused TEXT [FILE]: `run` says TEXT about it, which begins with its place; no folder comes. (Sanitizers take more
# time and memory.)
refused() {
    file=${2:-m.yaml}
    # shellcheck disable=SC3045
    (
        [ -n "${TARRY_TEST_SMALL:-}" ] || { ulimit -t 1 && ulimit -v 300000; }
        wrong "$1" run "$file" --out never
    ) && [ ! -e never ] && rm -rf m.yaml
}

: >m.yaml
ok "an empty file" refused "m.yaml:1:1: there is nothing in this file; a model begins with 'tarry: 1'"
printf '\n\n# only words\n' >m.yaml
ok "a file of comments" refused "m.yaml:1:1: there is nothing in this file"
printf '\377\376t\0a\0' >m.yaml
ok "UTF-16" refused "m.yaml:1:1: this file is in UTF-16; save it as UTF-8 text"
printf 'tarry: 1\ntitle: \303\050\n' >m.yaml
ok "a byte that is not UTF-8" refused "m.yaml:2:8: the byte 0xc3 here is not UTF-8; save the file as UTF-8 text"
printf 'tarry: 1\ntitle: a\0b\n' >m.yaml
ok "a NUL" refused "m.yaml:2:9: a NUL character stands here; a model is plain text"
head -c 100000000 /dev/zero | tr '\0' x >m.yaml
ok "100 MB" refused "m.yaml: this file is too large: at most 67108864 bytes are read"
ln -s /dev/zero m.yaml
ok "a file without end" refused "m.yaml: this file is too large"
head -c 100000 /dev/zero | tr '\0' '[' >m.yaml
ok "100,000 lists in lists" refused "m.yaml:1:65: maps and lists are nested deeper than 64 here"
{
    printf 'tarry: 1\na: '
    head -c 100 /dev/zero | sed 's/./{b: /g'
    for _ in 1 2 3 4 5 6 7 8 9 10; do printf '{b: {b: {b: {b: {b: {b: {b: '; done
} >m.yaml
ok "70 maps in maps" refused "nested deeper than 64 here"
{
    printf 'tarry: 1\nx: "'
    head -c 20000000 /dev/zero | tr '\0' y
    printf '"\n'
} >m.yaml
ok "a line of 20 MB" refused "m.yaml:2:1: a model has no key 'x'"
{
    cat small.yaml
    echo ---
    cat small.yaml
} >m.yaml
ok "two documents" refused "a second document begins here; one file holds one model"
mkdir m.yaml
ok "a folder" refused "m.yaml: this is a folder, and a file was expected"
ln -s m.yaml m.yaml
ok "a link to itself" refused "the model file 'm.yaml' cannot be read"
ok "no such file" refused "the model file 'nowhere.yaml' cannot be read" nowhere.yaml
{
    cat small.yaml
    printf 'parameters:\n'
    awk 'BEGIN { for (i = 0; i < 100000; i++) printf "  p%d: p%d + 1\n", i, i + 1; print "  p100000: p0" }'
} >m.yaml
ok "a circle of 100,000 parameters" refused "parameters are made of one another in a circle: p0 -> p1 -> p2"
awk 'BEGIN {
    printf "tarry: 1\ntime: min\ngenes:\n  vela:\n    promoter:\n"
    for (i = 0; i < 251; i++) printf "      s%d: {to: {s%d: 1}}\n", i, (i + 1) % 251
    print "    transcript: {half_life: 1}\nrun: {until: 1}"
}' >m.yaml
ok "251 states of a promoter" refused "m.yaml:6:7: a promoter has at most 250 states; this one has 251"
awk 'BEGIN {
    printf "tarry: 1\ntime: min\nspecies: {a: 0}\ndelays:\n"
    for (i = 0; i < 70; i++) printf "  d%d: d%d\n", i, i + 1
    print "  d70: 1\nreactions: {one: {rate: 1, later: [{after: d0, makes: {a: 1}}]}}\nrun: {until: 1}"
}' >m.yaml
ok "70 delays made of one another" refused "m.yaml:69:8: delays are made of one another more than 64 deep"

# An editor's mark and line ends of another system are no fault.
marked() {
    {
        printf '\357\273\277'
        sed 's/$/\r/' small.yaml
    } >marked.yaml
    run 0 check marked.yaml
}
ok "a byte order mark and carriage returns" marked

# ---- a German locale ------------------------------------------------------------------------------
# One is made of the few lines that matter; localedef's status is 1 for the categories left out, which is meant.
mkdir locales
cat >comma.src <<'LOCALE'
comment_char %
escape_char /
LC_NUMERIC
decimal_point ","
thousands_sep "."
grouping 3;3
END LC_NUMERIC
LOCALE
localedef -c -i comma.src ./locales/comma >comma.log 2>&1
comma() {
    env -u LC_ALL LOCPATH="$work/locales" LC_NUMERIC=comma "$@"
}
comma_locale() {
    # The shell by this name goes by the locale, the one by the name of sh may not.
    [ "$(comma bash -c 'printf %.1f 1,5' 2>err)" = 1,5 ]
}
ok "localedef makes a locale with a decimal comma" comma_locale

same_bytes() {
    run 0 run small.yaml --out plain && cp out plain.table &&
        comma "$TARRY" run small.yaml --out german >out 2>err && cmp -s out plain.table || return 1
    for file in plain/*; do
        part=${file##*/}
        case $part in
        run.json | figures) continue ;;
        report.html | summary.json) sed 's/german/plain/g' "german/$part" | cmp -s - "$file" || return 1 ;;
        *) cmp -s "german/$part" "$file" || return 1 ;;
        esac
    done
}
ok "a run gives the same bytes in a locale with a decimal comma, as the German one" same_bytes

same_words() {
    for case in "${models%/models}"/tests/cli/*.case; do
        sed -n '/^--- model.yaml$/,/^--- /p' "$case" | sed '1d; /^--- /d' >m.yaml
        [ -s m.yaml ] || continue
        "$TARRY" check m.yaml >one 2>&1
        comma "$TARRY" check m.yaml >other 2>&1
        cmp -s one other || return 1
    done
}
ok "and all that is refused is refused in the same words" same_words
finish
