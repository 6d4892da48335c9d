#!/bin/sh
# SPDX-License-Identifier: GPL-3.0-or-later
# shellcheck disable=SC2317 # cases are functions, called by name
# Being interrupted: what is finished is saved and equals a run of just those cells.
# shellcheck source=tests/cli/helpers.sh
. "${0%/*}/helpers.sh"
small_model >small.yaml
many="--cells 1000000000 --threads 2"

# after SECONDS SIGNAL COMMAND... : the command's status, having sent it a signal. The shell starts
# what runs in the background with SIGINT ignored, hence timeout, which sends it from outside.
after() {
    seconds=$1
    signal=$2
    shift 2
    timeout --foreground --preserve-status -s "$signal" "$seconds" "$@"
}

for signal in INT TERM HUP; do
    saved() {
        # $many is a list of words.
        # shellcheck disable=SC2086
        after 1 "$signal" "$TARRY" run small.yaml $many --out "$signal" >out 2>err
        [ $? = 3 ] && says err "interrupted" && says out "(interrupted)" &&
            says "$signal/summary.json" '"status": "partial"'
    }
    ok "SIG$signal saves what is finished" saved
done

equal() {
    n=$(sed -n 's/^ *"cells": \([0-9]*\),$/\1/p' INT/summary.json)
    [ "$n" -gt 0 ] && run 0 run small.yaml --cells "$n" --out whole || return 1
    for file in INT/*.csv; do
        cmp -s "$file" "whole/${file#INT/}" || return 1
    done
    says whole/summary.json '"status": "complete"'
}
ok "a partial run equals a run of its cells" equal

twice() {
    # Cells that take minutes each: the first signal cannot end this soon.
    # shellcheck disable=SC2086
    "$TARRY" run small.yaml $many --until "100000000 min" --every "1000000 min" \
        --snapshots "100000000 min" --out twice >out 2>err &
    program=$!
    sleep 1
    kill -TERM "$program"
    sleep 1
    kill -0 "$program" || return 1
    kill -TERM "$program"
    sleep 1
    kill -KILL "$program" # only where the signal before has not ended it
    wait "$program"
    [ $? = 143 ] && [ ! -e twice ] # 128 + SIGTERM
}
ok "a second signal stops at once" twice 2>/dev/null

ignored() {
    # shellcheck disable=SC2086
    (trap '' HUP && exec "$TARRY" run small.yaml $many --out ignored >out 2>err) &
    program=$!
    sleep 1
    kill -HUP "$program"
    sleep 1
    ! says err "stopping" || return 1
    kill -TERM "$program"
    wait "$program"
    [ $? = 3 ] && says ignored/summary.json '"status": "partial"'
}
ok "a signal that was ignored stays ignored" ignored

# on_terminal TERM : what the program says on a terminal of this kind, in two seconds of a long run;
# script(1) gives it one.
on_terminal() {
    rm -rf bar
    echo "timeout --foreground -s INT 2 '$TARRY' run small.yaml $many --out bar >out" >bar.sh
    TERM=$1 script -qc "sh bar.sh" talk >/dev/null </dev/null
    says out "(interrupted)" && says talk "interrupted" && ! says out " left"
}

bar() {
    on_terminal xterm && says talk " of 1000000000 cells, " && says talk " left" &&
        on_terminal dumb && ! says talk " left"
}
if command -v script >/dev/null; then
    ok "a bar with the time left, on a terminal that can show it" bar
fi

finish
