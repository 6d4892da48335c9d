#!/bin/sh
# SPDX-License-Identifier: GPL-3.0-or-later
# shellcheck disable=SC2317 # cases are functions, called by name
# Commands, options and help.
# shellcheck source=tests/cli/helpers.sh
. "${0%/*}/helpers.sh"
small_model >small.yaml
gene_model >gene.yaml

all_commands() {
    run 0 help || return 1
    for command in check run predict measure fit compare plan sweep help version; do
        says out "tarry $command" || return 1
    done
    [ ! -s err ]
}
ok "help lists the commands" all_commands

all_options() {
    run 0 help run || return 1
    for option in out overwrite cells settle until every snapshots seed set threads sampler keep \
        figures genes quiet; do
        says out "--$option" || return 1
    done
}
ok "help run lists the options" all_options

same_help() {
    run 0 help run && mv out help && run 0 run --help && cmp -s out help && run 0 run -h &&
        cmp -s out help
}
ok "run --help and -h are help run" same_help

narrow() {
    run 0 help && ! grep -q '.\{81\}' out && run 0 help run && ! grep -q '.\{81\}' out
}
ok "help fits 80 columns" narrow

ok "version" run 0 version
ok "version is one line" [ "$(cat out)" = "tarry 0.1.0" ]
built() {
    run 0 version --build && says out GSL && says out libyaml
}
ok "version --build" built

ok "no command" wrong "a command is due"
ok "unknown command, nearest" wrong "did you mean 'run'" rnu
ok "a file in place of a command" wrong "tarry run small.yaml" small.yaml
ok "unknown option, nearest" wrong "did you mean --cells?" run small.yaml --cels 5
ok "option of another command" wrong "no option --out" check small.yaml --out x
ok "one dash" wrong "two dashes" run small.yaml -cells 5

for bad in 0 -5 5x 1e3 5.0 0x10 " 5" +5 99999999999999999999; do
    ok "--cells '$bad'" wrong "a whole number from 1 to" run small.yaml --cells "$bad"
done
ok "--cells without a number" wrong "--cells needs N" run small.yaml --cells
ok "--cells before another option" wrong "--cells needs N" run small.yaml --cells --quiet
ok "--cells=" wrong "--cells needs N" run small.yaml --cells=
ok "--seed -1" wrong "a whole number from 0 to" run small.yaml --seed -1
ok "--threads 0" wrong "a whole number from 1 to" run small.yaml --threads 0
ok "a flag with a value" wrong "takes no value" run small.yaml --overwrite=yes
ok "--set without a value" wrong "NAME=VALUE" run small.yaml --set k_open
ok "--set of what is no parameter" wrong "--set" run small.yaml --set k_open=1
ok "a time that is none" wrong "--until" run small.yaml --until "ten minutes"
ok "unknown sampler" wrong "directt" run small.yaml --sampler directt

ok "genes that figures show, one of them unknown" wrong "did you mean 'vela'?" run gene.yaml --genes lyra,vola
ok "genes of a model without any" wrong "neither genes" run small.yaml --genes vela
ok "an empty name among genes" wrong "names with commas" run gene.yaml --genes vela,,lyra
ok "figures of no known kind" wrong "svg, pdf, png and none" run small.yaml --figures gif
for command in fit compare plan sweep; do
    ok "$command, not yet" wrong "not yet" "$command" small.yaml
done

ok "missing model" wrong "'nowhere.yaml' cannot be read" run nowhere.yaml
ok "a folder as a model" wrong "folder" run .
ok "check without a model" wrong "check MODEL" check
ok "two models" wrong "'small.yaml' and 'other.yaml'" run small.yaml other.yaml

forms() {
    run 0 run small.yaml --out a --cells=7 --seed=3 --every "0.25 min" &&
        run 0 run small.yaml --out b --cells 9 --seed 3 --every 1 --every "0.25 min" --cells 7 &&
        cmp -s a/means.csv b/means.csv
}
ok "values by = and by a word, the last one counts" forms
dashed() {
    cp small.yaml ./--odd.yaml && run 0 run --cells 5 --out odd -- --odd.yaml
}
ok "what follows -- is no option" dashed
ok "--figures none" run 0 run small.yaml --out c --cells 5 --figures none

finish
