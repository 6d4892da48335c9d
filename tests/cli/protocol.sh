#!/bin/sh
# SPDX-License-Identifier: GPL-3.0-or-later
# shellcheck disable=SC2317 # cases are functions, called by name
# Repeats of the protocol give the files of their steps written out, and a ramp those of its steps but
# for first responses: a ramp is one step to respond to.
# shellcheck source=tests/cli/helpers.sh
. "${0%/*}/helpers.sh"

# model NAME: the head of a model whose protocol comes on standard input
model() {
    cat - >protocol
    cat >"$1.yaml" <<'HEAD'
tarry: 1
time: min
parameters: {k_open: 0.04, twice: 2 * k_open}
species: {load: 0}
genes:
  vela:
    promoter:
      shut: {to: {open: twice}}
      open: {to: {shut: 0.35}, initiates: 6}
    transcript: {stages: {nascent: {gamma: {mean: 2, sd: 1}}}, half_life: 35 min}
run: {cells: 5, until: 100, every: 1, windows: {early: [0, 30], late: [30, 100]}}
protocol:
HEAD
    cat protocol >>"$1.yaml"
}

# same ONE OTHER [FILE]: both runs write the same tables, but for one of this name
same() {
    run 0 run "$1.yaml" --keep 5 --out "$1.out" && run 0 run "$2.yaml" --keep 5 --out "$2.out" || return 1
    for file in "$1.out"/*.csv; do
        [ "${file##*/}" = "${3:-}" ] && continue
        cmp "$file" "$2.out/${file##*/}" >out 2>&1 || return 1
    done
}

model repeated <<'STEPS'
- {from: 10, every: 20, times: 3, do: [{at: 5, set: {vela.promoter: open}}, {at: 0, set: {k_open: k_open / 2}}]}
STEPS
model written <<'STEPS'
- {at: 10, set: {k_open: k_open / 2}}
- {at: 15, set: {vela.promoter: open}}
- {at: 30, set: {k_open: k_open / 2}}
- {at: 35, set: {vela.promoter: open}}
- {at: 50, set: {k_open: k_open / 2}}
- {at: 55, set: {vela.promoter: open}}
STEPS
ok "repeats, and the same steps written out" same repeated written

# 0.25 and 0.75 of the way from 0.04 to 0.2 as the program works them out: 0.04 + share * (0.2 - 0.04)
model ramp <<'STEPS'
- {from: 20, to: 40, ramp: {k_open: 0.2}, steps: 2}
STEPS
model steps <<'STEPS'
- {at: 20, set: {k_open: 0.04 + 0.25 * (0.2 - 0.04)}}
- {at: 30, set: {k_open: 0.04 + 0.75 * (0.2 - 0.04)}}
- {at: 40, set: {k_open: 0.2}}
STEPS
ok "a ramp, and the same steps written out" same ramp steps first.csv

# steps_of RUN: the steps that first.csv tells of, in one line
steps_of() {
    tail -n +2 "$1.out/first.csv" | cut -d , -f 2 | sort -un | tr '\n' ' '
}
responses() {
    [ "$(steps_of ramp)" = "20 " ] && [ "$(steps_of steps)" = "20 30 40 " ] &&
        [ "$(steps_of repeated)" = "10 15 30 35 50 55 " ]
}
ok "a ramp is one step to respond to, a repeat is as many as it has" responses
finish
