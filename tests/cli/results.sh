#!/bin/sh
# SPDX-License-Identifier: GPL-3.0-or-later
# shellcheck disable=SC2317 # cases are functions, called by name
# What a run leaves: streams, files, overwriting, full disks and closed pipes.
# shellcheck source=tests/cli/helpers.sh
. "${0%/*}/helpers.sh"
small_model >small.yaml

streams() {
    run 0 run small.yaml && says out "100 cells" && says err "results in small.out" &&
        ! grep -q "^tarry:" out && [ -f small.out/summary.json ]
}
ok "a run: the table on standard output, talk on standard error" streams

# Simulating that many cells would take hours.
ok "an existing folder is refused before simulating" wrong "--overwrite" run small.yaml --cells 1000000000
replaced() {
    echo mine >small.out/notes.txt
    run 0 run small.yaml --overwrite --cells 50 && says small.out/notes.txt mine &&
        says small.out/summary.json '"cells": 50'
}
ok "--overwrite replaces the results and leaves other files" replaced
stranger() {
    echo mine >small.out/cells.csv
    wrong "cells.csv" run small.yaml --overwrite --keep 2 && says small.out/cells.csv mine &&
        says small.out/summary.json '"cells": 50'
}
ok "a file that no earlier run named is not overwritten" stranger
ok "a folder whose parent is missing is refused before simulating" wrong "no/such" run small.yaml --out no/such --cells 1000000000
ok "a file in place of the folder" wrong "small.yaml" run small.yaml --out small.yaml --cells 1000000000

quiet() {
    run 0 run small.yaml --out quiet --quiet && [ ! -s err ] && says out "100 cells"
}
ok "--quiet says nothing on standard error" quiet
ok "no progress bar where standard error is no terminal" sh -c '! grep -q "%" err'

same_bytes() {
    run 0 run small.yaml --out one --threads 1 --keep 3 && cp out table &&
        run 0 run small.yaml --out three --threads 3 --keep 3 && cmp -s out table || return 1
    # shellcheck disable=SC2044 # no blanks in these names
    for file in $(find one -type f); do
        [ "$file" = one/run.json ] || cmp -s "$file" "three/${file#one/}" || return 1
    done
    [ "$(find one -type f | wc -l)" = "$(find three -type f | wc -l)" ]
}
ok "the same bytes for one thread and for three" same_bytes

digests() {
    # One file a line: {"name": "means.csv", "size": 123, "sha256": "..."}
    sed -n 's/^ *{"name": "\([^"]*\)", "size": [0-9]*, "sha256": "\([^"]*\)"}.*/\2  \1/p' \
        one/summary.json >list
    [ "$(wc -l <list)" -ge 3 ] && (cd one && sha256sum -c --quiet ../list)
}
ok "sizes and digests are those of the files" digests

demo() {
    run 0 run --cells 3 --settle 0 --until "10 min" --every "1 min" --snapshots "10 min" &&
        says err "demonstration" && says out "3 cells" && [ -f two_state.out/summary.json ] &&
        run 0 run "$models/two_state.yaml" --cells 3 --settle 0 --until "10 min" --every "1 min" \
            --snapshots "10 min" --out by_file && cmp -s by_file/means.csv two_state.out/means.csv
}
ok "without a model the demonstration runs" demo

full() {
    [ -c /dev/full ] || return 0
    "$TARRY" run small.yaml --out full >/dev/full 2>err
    [ $? = 1 ] && says err "standard output could not be written" && [ -f full/summary.json ] ||
        return 1
    "$TARRY" help >/dev/full 2>err
    [ $? = 1 ]
}
ok "standard output that is full" full
gone() {
    {
        "$TARRY" run small.yaml --cells 20000 --out gone 2>err
        echo $? >status
    } | true
    [ "$(cat status)" = 1 ] && says err "standard output could not be written" &&
        [ -f gone/summary.json ]
}
ok "a pipe whose reader is gone" gone
closed() {
    "$TARRY" run small.yaml --out closed >&- 2>err
    [ $? = 1 ] && says err "standard output could not be written" && [ -f closed/summary.json ]
}
ok "standard output that is closed" closed
no_room() {
    # A limit of 512 bytes a file stands for the full disk.
    (
        ulimit -f 1
        "$TARRY" run small.yaml --every "0.001 min" --out no_room >out 2>err
    )
    [ $? = 1 ] && says err "cannot write" && [ ! -f no_room/summary.json ] &&
        [ -z "$(ls no_room)" ] && run 0 run small.yaml --out no_room
}
ok "a disk that is full leaves no half-made results" no_room

finish
