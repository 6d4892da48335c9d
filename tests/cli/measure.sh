#!/bin/sh
# SPDX-License-Identifier: GPL-3.0-or-later
# shellcheck disable=SC2317 # cases are functions, called by name
# tarry measure: the figures of a run from a file of data.
# shellcheck source=tests/cli/helpers.sh
. "${0%/*}/helpers.sh"

species=vela.shut,vela.open,vela.nascent,vela.nuclear,vela.transcript,vela.immature,vela.protein
"$TARRY" run "$models/two_state.yaml" --cells 70 --until "120 min" --snapshots "120 min" --keep 70 --out run \
    --figures none --quiet >/dev/null 2>&1

# The traces of a run, measured: where the estimator is the same, so are the numbers, to the byte.
as_the_run() {
    run 0 measure run/cells.csv --time min --counted "$species" --snapshots 120 --out measured --figures none || return 1
    cmp -s run/means.csv measured/means.csv && cmp -s run/distribution.csv measured/distribution.csv
}
ok "means and distributions of a run's traces are the run's" as_the_run

# Covariances are sums about another shift: the same to rounding. The correlation of a count is over its variance in
# both; that of the signal is not, as data do not tell their read-out noise.
correlations() {
    awk -F, 'FNR == 1 { next }
        FILENAME ~ /^run/ { covariance[$2, $3, $4] = $6; correlation[$2, $3, $4] = $7; low[$2, $3, $4] = $8; n++; next }
        ($2, $3, $4) in covariance {
            seen++
            key = $2 SUBSEP $3 SUBSEP $4
            bad += off($6, covariance[key]) + ($2 != "spot" && off($7, correlation[key]) + off($8, low[key]) > 0)
        }
        function off(a, b) { return (a - b)^2 > 1e-18 * (b * b + 1) }
        END { exit !(n > 100 && seen == n && bad == 0) }' run/autocorrelation.csv measured/autocorrelation.csv
}
ok "covariances and correlations are the run's" correlations

pooled() {
    grep '^spot,all,signal_' run/signals.csv >one
    grep '^spot,all,signal_' measured/signals.csv | cmp -s - one && [ "$(wc -l <one)" = 3 ]
}
ok "pooled figures of a signal are the run's" pooled

# Less than all frames: other means, and windows that begin later than at 0.
cut_out() {
    run 0 measure run/cells.csv --time min --from 30 --to "1 h" --out cut --figures none || return 1
    says out "a frame every 1 min from 30 to 60 min" && grep '^spot,' cut/means.csv >one &&
        awk -F, '$1 == "spot" && $2 >= 30 && $2 <= 60' run/means.csv | cmp -s - one
}
ok "--from and --to cut" cut_out

threads() {
    run 0 measure run/cells.csv --time min --threads 1 --out one_thread &&
        run 0 measure run/cells.csv --time min --threads 3 --out three || return 1
    for file in means.csv distribution.csv autocorrelation.csv signals.csv summary.json report.html; do
        cmp -s "one_thread/$file" "three/$file" || return 1
    done
}
ok "the same bytes for any number of threads" threads

page() {
    says one_thread/report.html "Measured data" && says one_thread/report.html "tarry measure cells.csv --time min" &&
        says one_thread/summary.json '"method": "measurement"' && ! says one_thread/report.html "seed"
}
ok "the page tells of data" page

# Counts a row a cell, with cells named, and as a histogram: the same means.
printf 'time,count\n0,0\n0,0\n0,3\n5,2\n5,7\n' >rows.csv
printf 'cell,time,count\na,0,0\nb,0,0\nc,0,3\nd,5,2\ne,5,7\n' >cells.csv
printf '# invented\ntime,count,cells\n0,0,2\n0,3,1\n5,2,1\n5,7,1\n' >histogram.csv
counts() {
    for file in rows cells histogram; do
        run 0 measure "$file.csv" --time h && says out "5 fixed cells, counts at 2 times from 0 to 5 h; intervals by cell (5)" || return 1
    done
    cut -d, -f1-5,7,9 rows.measured/means.csv >one
    cut -d, -f1-5,7,9 cells.measured/means.csv | cmp -s - one &&
        cut -d, -f1-5,7,9 histogram.measured/means.csv | cmp -s - one &&
        says one "count,0,1,1.7320508075688772,1,3," && says one "count,5,4.5,3.5355339059327378,2.5,"
}
ok "counts in three forms" counts

means() {
    printf 'time,lum,lum_se\n0,1.5,0.1\n4,2.5,0.25\n' >se.csv
    printf 'time,lum\n0,1.5\n0,1.75\n4,2.5\n4,2.25\n' >replicates.csv
    run 0 measure se.csv --time h && says se.measured/means.csv "lum,4,2.5,,0.25,,,,," &&
        run 0 measure replicates.csv --time h && says out "4 rows, means at 2 times" &&
        grep -q "^lum,4,2.375,0.1767766952966[0-9]*,0.125," replicates.measured/means.csv
}
ok "means with their errors, and of replicates" means

refused() {
    run 2 measure rows.csv --time h && says err "not empty" && run 0 measure rows.csv --time h --overwrite --quiet &&
        [ ! -s err ] && run 2 measure --time h && says err "DATA.csv" && run 2 measure nowhere.csv --time h
}
ok "folders and files" refused

# near FILE FILE : the same texts, and numbers to nine digits (other machines round otherwise)
near() {
    [ "$(wc -l <"$1")" = "$(wc -l <"$2")" ] && paste -d, "$1" "$2" | awk -F, '
        { for (i = 1; i <= NF / 2; i++) if ($i != $(i + NF / 2) && ($i - $(i + NF / 2))^2 > 1e-18 * ($i * $i + 1)) bad++ }
        END { exit !(NR > 5 && bad == 0) }'
}

# The invented data are what their heads say.
film() {
    run 0 run "$models/data/film.yaml" --keep 60 --out film --figures none && grep -v "^#" "$models/data/film.csv" >told &&
        near film/cells.csv told
}
ok "models/data/film.csv is made as it says" film

fixed() {
    run 0 run "$models/data/counts.yaml" --keep 600 --out fixed --figures none && grep -v "^#" "$models/data/counts.csv" >told &&
        awk -F, 'BEGIN { split("0 20 30 50 90", at, " "); print "time,count" } $2 == at[$1 % 5 + 1] { print $2 "," $3 | "sort -t, -k1,1n -s" }' \
            fixed/cells.csv >made && near made told
}
ok "models/data/counts.csv is made as it says" fixed

curve() {
    run 0 run "$models/data/lum.yaml" --out curve --figures none && grep -v "^#" "$models/data/lum.csv" >told &&
        awk -F, '$1 == "name" { print "time,lum,lum_se" } $1 == "lum" { print $2 "," $3 "," $5 }' curve/means.csv >made && near made told
}
ok "models/data/lum.csv is made as it says" curve

# Thresholds: a film measured by them has the periods that the run has by the same.
visible() {
    run 0 run "$models/data/film.yaml" --visible "1,2,1 min" --out seen --figures none &&
        run 0 measure "$models/data/film.csv" --time min --visible "1,2,1 min" --out seen_too || return 1
    grep '^spot,all,.*visible\|^spot,all,dark' seen/signals.csv >one
    grep '^spot,all,.*visible\|^spot,all,dark' seen_too/signals.csv | cmp -s - one && [ "$(wc -l <one)" = 4 ] &&
        grep '^spot,' seen/dwells.csv >one && grep '^spot,' seen_too/dwells.csv | cmp -s - one &&
        [ "$(wc -l <one)" -gt 20 ] && says seen_too/summary.json '"length": 1' &&
        says seen/summary.json '"length": 1' && says seen_too/report.html "Visible is not active"
}
ok "visible periods of a film are the run's" visible
found() {
    run 0 measure "$models/data/film.csv" --time min --visible auto --out found --figures none &&
        says out "Visible: spot above 1.8" && says out "its background was taken to be"
}
ok "thresholds from the background" found
printf 'cell,time,spot\na,0,\0001\n' >binary.csv
ok "a file with a byte that is no text" wrong "binary.csv:1:1: this is no text" measure binary.csv --time min
awk 'BEGIN { printf "cell,time"; for (i = 0; i < 300; i++) printf ",s%d", i; print "" }' >wide.csv
ok "300 columns" wrong "at most 200 columns of values" measure wide.csv --time min
awk 'BEGIN { printf "cell,time"; for (i = 0; i < 600; i++) printf ",s%d", i; print "" }' >wider.csv
ok "600 columns" wrong "at most 200 columns of values" measure wider.csv --time min
finish
