#!/bin/sh
# SPDX-License-Identifier: GPL-3.0-or-later
# shellcheck disable=SC2317 # cases are functions, called by name
# Like genes give the files of the same genes written out, and many of them stay small on the page.
# shellcheck source=tests/cli/helpers.sh
. "${0%/*}/helpers.sh"

# gene NAME [MANY]: a gene that is held down by its own protein
gene() {
    cat <<GENE
  $1:
    ${2:+many: $2}
    copies: 2
    promoter:
      shut: {to: {open: "0.2 * repress($1.protein, 4, 2)"}}
      open: {to: {shut: 0.35}, initiates: 6}
    transcript: {stages: {nascent: {gamma: {mean: 2, sd: 1}}, nuclear: wait}, half_life: 35 min}
    protein: {translation: 0.1, lifetime: {fixed: 20}}
GENE
}

# model NAME N: its genes come on standard input
model() {
    {
        printf 'tarry: 1\ntime: min\ndelays: {wait: {fixed: 3}}\ngenes:\n'
        cat
        printf 'run: {cells: %s, until: 30, every: 1}\n' "$2"
    } >"$1.yaml"
}

gene vela 3 | model many 5
for i in 1 2 3; do gene "vela_$i"; done | model written 5
same() {
    run 0 run many.yaml --keep 5 --out many.out && run 0 run written.yaml --keep 5 --out written.out || return 1
    for file in many.out/*.csv; do
        cmp "$file" "written.out/${file##*/}" >out 2>&1 || return 1
    done
}
ok "like genes, and the same genes written out" same

gene vela 2000 | model crowd 2
few_lines() {
    run 0 run crowd.yaml --out crowd.out && [ "$(wc -l <out)" -lt 60 ] && [ "$(wc -l <err)" -lt 10 ] &&
        grep -q "Spread over 2000 genes" out && grep -q "^vela_2000,all,burst_frequency" crowd.out/bursts.csv
}
ok "two thousand genes: few lines on the terminal, all in the files" few_lines

# Above 1,000 names summary.json points to the files.
bounded() {
    grep -q '"genes_left_out": {"names": 1000, "stand_in": "bursts.csv"}' crowd.out/summary.json &&
        ! grep -q '"vela_1001": {' crowd.out/summary.json &&
        [ "$(wc -c <crowd.out/summary.json)" -lt 6000000 ] &&
        [ "$(wc -c <crowd.out/report.html)" -lt 1500000 ]
}
ok "two thousand genes: summary.json and the page stay small" bounded

# Ten thousand genes are read, checked and run in 1 GB (sanitizers take address space of their own).
gene vela 10000 | sed 's/copies: 2/copies: 1/' | model throng 10
in_bounds() {
    (
        # -v is no part of the standard, but of every shell that is /bin/sh somewhere.
        # shellcheck disable=SC3045
        [ -n "${TARRY_TEST_SMALL:-}" ] || ulimit -v 1000000
        run 0 check throng.yaml &&
            run 0 run throng.yaml --until 5 --every 1 --out throng.out --figures none --quiet
    ) && [ "$(wc -l <out)" -lt 80 ]
}
ok "ten thousand genes in 1 GB" in_bounds
finish
