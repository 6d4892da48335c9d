#!/bin/sh
# SPDX-License-Identifier: GPL-3.0-or-later
# shellcheck disable=SC2317 # cases are functions, called by name
# tarry predict: the files and the table of a run, without one.
# shellcheck source=tests/cli/helpers.sh
. "${0%/*}/helpers.sh"

whole() {
    run 0 predict "$models/two_state.yaml" || return 1
    says out "worked out without simulation" && says out "17.14" && says out "vela.protein" &&
        says two_state.exact/summary.json '"method": "exact"' &&
        ! grep -q '"cells"' two_state.exact/summary.json
}
ok "the table and the files" whole

# Each table has the header that a run gives it, and rows in the same order of names.
as_a_run() {
    run 0 run "$models/two_state.yaml" --cells 20 --out run --figures none || return 1
    for table in means bursts signals burst_sizes dwells autocorrelation distribution; do
        head -n 1 "run/$table.csv" >one
        head -n 1 "two_state.exact/$table.csv" | cmp -s - one || return 1
        awk -F, 'NR == FNR { seen[$1 "," $3]; next } FNR > 1 && $1 "," $3 in seen { print $1 "," $3 }' \
            two_state.exact/bursts.csv run/bursts.csv >of_run
    done
    sed 1d two_state.exact/bursts.csv | cut -d, -f1,3 | cmp -s - of_run
}
ok "tables are those of a run" as_a_run

# Twice the rate of initiation, twice the size of a burst.
set_rate() {
    run 0 predict "$models/burst_sizes.yaml" --out slow --set k_init=4 &&
        run 0 predict "$models/burst_sizes.yaml" --out fast --set k_init=8 || return 1
    awk -F, '$3 == "burst_size_mean" { print $1, $5 * (FILENAME ~ /slow/ ? 2 : 1) }' slow/bursts.csv >doubled
    awk -F, '$3 == "burst_size_mean" { print $1, $5 * 1 }' fast/bursts.csv | cmp -s - doubled
}
ok "--set changes what is predicted" set_rate

refused() {
    run 2 predict "$models/two_state.yaml" && says err "not empty" &&
        run 0 predict "$models/two_state.yaml" --overwrite --quiet && [ ! -s err ]
}
ok "a folder that is there, and --overwrite" refused

# A picture of each kind that has exact values, and none that would need cells.
figures() {
    for kind in autocorrelation burst-sizes counts dwells in-transit time-course; do
        grep -q "</svg>" "two_state.exact/figures/gene-vela-$kind.svg" || return 1
    done
    [ ! -e two_state.exact/figures/gene-vela-traces.svg ] &&
        says two_state.exact/report.html "Exact values: there are no intervals" &&
        run 0 predict "$models/two_state.yaml" --overwrite --figures none &&
        [ ! -e two_state.exact/figures/gene-vela-counts.svg ]
}
ok "figures" figures

regulated() {
    run 0 predict "$models/delayed_feedback.yaml" && says out "reads counts of species"
}
ok "what is not covered says why" regulated
told_before() {
    run 0 check "$models/delayed_feedback.yaml" && says out "rigel  none: the rate of 'rigel.initiation' reads counts of species" &&
        run 0 check "$models/burst_sizes.yaml" && grep -q "^  mira  yes$" out && grep -q "^  lyra  yes$" out &&
        run 0 check "$models/binding.yaml" && says out "none: they are laws of genes"
}
ok "check says which genes have exact laws" told_before
finish
