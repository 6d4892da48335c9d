#!/bin/sh
# SPDX-License-Identifier: GPL-3.0-or-later
# shellcheck disable=SC2317 # cases are functions, called by name
# tarry measure --beside: exact laws of a model laid over data.
# shellcheck source=tests/cli/helpers.sh
. "${0%/*}/helpers.sh"
film=$models/data/film
beside() {
    run 0 measure "$film.csv" --time min --beside "$film.yaml" "$@"
}

agrees() {
    beside --out as_it_is --threads 1 && says out "Beside film.yaml: of " && ! says out "not as" &&
        says as_it_is/report.html "The text of film.yaml, as it was read." &&
        says as_it_is/report.html "exact law of film.yaml" && says as_it_is/report.html "--beside" &&
        says as_it_is/summary.json '"beside": {' && says as_it_is/summary.json '"file": "film.yaml"'
}
ok "data beside the model that made them" agrees

drawn() {
    [ ! -f as_it_is/figures/signals-autocorrelation.csv ] || grep -q exact as_it_is/figures/signals-autocorrelation.gp
}
ok "the laws are in the figures" drawn

same() {
    beside --out two --threads 2 --figures none && beside --out one --threads 1 --figures none &&
        cmp -s one/summary.json two/summary.json && cmp -s one/report.html two/report.html
}
ok "the same bytes for any number of threads" same

differs() {
    beside --set "seen=5 min" --out longer --figures none && says out "these data are not as" &&
        says longer/summary.json '"alarm": true' && says out "exact value 4.5" &&
        says longer/report.html "seen=5 min"
}
ok "another lag: the data are not as the model has it" differs

counted() {
    run 0 measure "$models/data/counts.csv" --time min --beside "$models/data/counts.yaml" --out counts --figures none &&
        says out "Beside counts.yaml: of 5 figures with an exact law"
}
ok "counts in fixed cells at several times" counted

same_figures() {
    beside --out laws --figures none && run 0 measure "$film.csv" --time min --out bare --figures none &&
        cmp -s laws/means.csv bare/means.csv && cmp -s laws/autocorrelation.csv bare/autocorrelation.csv
}
ok "the data's own figures stay as they are" same_figures

ok "a parameter without a model" wrong "it goes with --beside MODEL" measure "$film.csv" --time min --set seen=5 --out none
ok "a parameter that the model has not" wrong "no parameter" measure "$film.csv" --time min --beside "$film.yaml" --set sen=5 --out none
ok "a model that is not there" wrong "none.yaml" measure "$film.csv" --time min --beside none.yaml --out none
ok "a model in another unit of time" wrong "both must be the same" measure "$film.csv" --time s --beside "$film.yaml" --out none
ok "a model without the data's names" wrong "rename the column 'spot'" measure "$film.csv" --time min --beside "$models/two_colours.yaml" --out none
shifted() {
    sed 's/^\([0-9]*\),\([0-9.]*\),/\1,\2,/; /^[0-9]*,0,/d' "$film.csv" |
        awk -F, -v OFS=, '/^[0-9]/ { $2 += 0.2 } { print }' >shifted.csv
    wrong "let their times begin at 0" measure shifted.csv --time min --beside "$film.yaml" --out none
}
ok "frames that are none of the model's" shifted
finish
