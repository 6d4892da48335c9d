#!/bin/sh
# SPDX-License-Identifier: GPL-3.0-or-later
# shellcheck disable=SC2317 # cases are functions, called by name
# tarry run --as-data: a run told as a laboratory would tell it, and measured through that door.
# shellcheck source=tests/cli/helpers.sh
. "${0%/*}/helpers.sh"

cat >film.yaml <<'YAML'
tarry: 1
title: Spots that are looked for
time: min
genes:
  vela:
    promoter: {shut: {to: {open: 0.1}}, open: {to: {shut: 0.4}, initiates: 6}}
    start: steady
    transcript: {stages: {nascent: {fixed: 3}}, half_life: 10}
signals:
  spot: {of: vela.nascent, ramp: {from: 0, to: 1}, noise: 0.3}
  found: {of: vela.nascent, ramp: {from: 0, to: 1}, noise: 0.3, detects: {above: 1}}
  tracked: {of: vela.nascent, ramp: {from: 0, to: 1}, noise: 0.3, detects: {above: 1, from_first: yes}}
run: {cells: 90, settle: 60, until: 40, every: 0.5, snapshots: [10, 20, 40], seed: 1}
YAML
run_as() {
    run 0 run film.yaml --keep 90 --as-data "$1" --out "$1" --figures none
}

head_tells() {
    run_as traces && says traces/data.csv "# Simulated data, not measured: Spots that are looked for" &&
        says traces/data.csv "Made by: tarry run film.yaml --cells 90 --seed 1 --sampler direct --keep 90 --as-data traces" &&
        says traces/data.csv "#       promoter: {shut: {to: {open: 0.1}}" && says traces/summary.json '"name": "data.csv"' &&
        says traces/summary.json '"as_data": "traces"' && says traces/report.html "as-data traces"
}
ok "the head says that it is simulated, from which model and by which command" head_tells

again() {
    command=$(sed -n 's/^# Time in min. Made by: tarry \(.*\) (tarry .*/\1/p' traces/data.csv)
    # shellcheck disable=SC2086 # words of a command
    run 0 $command --out again --threads 2 && run 0 $command --out alone --threads 1 &&
        cmp -s traces/data.csv again/data.csv && cmp -s traces/data.csv alone/data.csv
}
ok "the command at the head gives the same bytes, on any number of threads" again

measured() {
    run 0 measure traces/data.csv --time min --gaps missing --out measured --figures none || return 1
    says measured/summary.json "Simulated data, not measured: Spots that are looked for" || return 1
    for signal in spot found tracked; do
        grep "^$signal,[0-9.]*," traces/means.csv >one
        [ "$(wc -l <one)" = 81 ] || return 1
        awk -F, 'NR == FNR { row[$1, $2] = $0; next } row[$1, $2] != $0 { exit 1 }' measured/means.csv one &&
            grep "^$signal,all,signal_" traces/signals.csv >one || return 1
        grep "^$signal,all,signal_" measured/signals.csv | cmp -s - one || return 1
    done
}
ok "films: measured, they give the run's means, with what was not detected missing" measured

missing() {
    [ "$(grep -c '^[0-9]' traces/data.csv)" = $((90 * 81)) ] && grep -q '^[0-9]*,[0-9.]*,[-0-9.e]*,,' traces/data.csv
}
ok "films: an empty field where a signal was not detected" missing

left_out() {
    sed '/^  spot/d; /^  tracked/d' film.yaml >found.yaml
    run 0 run found.yaml --as-data traces --out found --figures none || return 1
    n=$(grep -c '^[0-9]' found/data.csv)
    [ "$n" -gt 100 ] && [ "$n" -lt $((90 * 81)) ] && ! grep -q ',$' found/data.csv
}
ok "films: no row where nothing was detected" left_out

counts() {
    run_as counts && says counts/data.csv "cell,time,vela.nascent,vela.transcript" || return 1
    awk -F, '/^[0-9]/ && FNR == NR { kept[$1, $2] = $5 "," $6; next }
        /^[0-9]/ { n++; bad += $2 != (n % 3 == 1 ? 10 : n % 3 == 2 ? 20 : 40) || $1 != n - 1 || kept[$1, $2] != $3 "," $4 }
        END { exit !(n == 90 && !bad) }' counts/cells.csv counts/data.csv &&
        run 0 measure counts/data.csv --time min --out fixed --figures none &&
        says out "90 fixed cells, counts at 3 times from 10 to 40 min"
}
ok "counts: each cell at one snapshot, as it is in its trace" counts

means() {
    run_as means && says means/data.csv "time,spot,spot_se,found,found_se,tracked,tracked_se" || return 1
    awk -F, 'FNR == NR { if ($1 == "found") row[$2] = $3 "," $5; next }
        /^[0-9]/ { n++; bad += row[$1] != $4 "," $5 } END { exit !(n == 81 && !bad) }' means/means.csv means/data.csv &&
        run 0 measure means/data.csv --time min --out curve --figures none && grep -q '^spot,20,' curve/means.csv
}
ok "means: those of means.csv with their standard errors" means

unseen() {
    sed '/^signals/,/^  tracked/d' film.yaml >unseen.yaml
    run 0 run unseen.yaml --as-data traces --out unseen --figures none &&
        says unseen/data.csv "cell,time,vela.nascent,vela.transcript"
}
ok "films of a model without signals have its products" unseen

ok "an unknown form" wrong "one of traces, counts and means" run film.yaml --as-data films --out none
taken() {
    printf 'tarry: 1\ntime: min\nspecies: {cell: 0}\nreactions: {make: {makes: {cell: 1}, rate: 1}}\nrun: {cells: 2, until: 5}\n' >cell.yaml
    wrong "a column 'cell' has a meaning of its own" run cell.yaml --as-data counts --out none
}
ok "a name that has a meaning of its own in data" taken
nothing() {
    sed "s/seed: 1/record: [vela.open], seed: 1/; /^signals/,/^  tracked/d" film.yaml >open.yaml
    wrong "name what is seen under 'record'" run open.yaml --as-data traces --out none
}
ok "nothing that is seen is recorded" nothing
memory() {
    { cat film.yaml && echo 'limits: {memory: 3 MB}'; } >little.yaml
    run 1 run little.yaml --as-data traces --cells 100000 --out none && says err "kept traces 518 MB"
}
ok "films that need more memory than the limit" memory
