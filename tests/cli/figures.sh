#!/bin/sh
# SPDX-License-Identifier: GPL-3.0-or-later
# shellcheck disable=SC2317 # cases are functions, called by name
# Figures: kinds, what is written beside them, quoting, and a gnuplot that does not do as it should.
# shellcheck source=tests/cli/helpers.sh
. "${0%/*}/helpers.sh"
gene_model >gene.yaml

# fake NAME: a program in the place of gnuplot, its script on standard input
fake() {
    { echo '#!/bin/sh' && cat; } >"$1" && chmod +x "$1"
}

# files ENDING DIR: how many pictures of a kind
files() {
    find "$2/figures" -name "*.$1" | wc -l
}

# listed DIR: every file of the folder of figures is in summary.json, with its digest, and no other
listed() {
    sed -n 's/^ *{"name": "\(figures[^"]*\)", "size": [0-9]*, "sha256": "\([^"]*\)"}.*/\2  \1/p' \
        "$1/summary.json" >list
    (cd "$1" && sha256sum -c --quiet ../list) && [ "$(wc -l <list)" = "$(find "$1/figures" -type f | wc -l)" ]
}

# begins FILE OCTALS: the file's first bytes, as od -b writes them
begins() {
    [ "$(head -c 4 "$1" | od -An -b)" = "$2" ]
}

svg() {
    run 0 run gene.yaml --out svg && [ ! -e pwned ] && [ ! -e svg/figures/pwned ] && listed svg &&
        [ "$(files svg svg)" -ge 15 ] && [ "$(files svg svg)" = "$(files gp svg)" ] &&
        [ "$(files svg svg)" = "$(files csv svg)" ] || return 1
    for kind in gene-vela-traces gene-vela-time-course gene-vela-in-transit gene-vela-burst-sizes \
        gene-vela-dwells gene-vela-counts gene-vela-autocorrelation gene-vela-lags \
        gene-vela-first-responses signals-cross-correlation; do
        [ -s "svg/figures/$kind.svg" ] || return 1
    done
}
ok "--figures svg, the default: pictures, scripts and data, all listed" svg
nothing_left() {
    [ -z "$(find svg pdf png -name '*page*' -o -name '*.log' -o -name 'unfinished*')" ]
}

pdf() {
    run 0 run gene.yaml --out pdf --figures pdf && listed pdf && [ "$(files pdf pdf)" = "$(files svg svg)" ] &&
        [ "$(files svg pdf)" = 0 ] && begins pdf/figures/gene-vela-traces.pdf " 045 120 104 106"
}
ok "--figures pdf" pdf
png() {
    run 0 run gene.yaml --out png --figures png && listed png && [ "$(files png png)" = "$(files svg svg)" ] &&
        [ "$(files svg png)" = 0 ] && begins png/figures/gene-vela-traces.png " 211 120 116 107"
}
ok "--figures png" png
ok "nothing is left of what is made on the way" nothing_left
none() {
    run 0 run gene.yaml --out none --figures none && [ ! -e none/figures ]
}
ok "--figures none" none

again() {
    sleep 1 # a PDF has the time in it, to the second
    for kind in svg pdf png; do
        run 0 run gene.yaml --out again --overwrite --figures "$kind" --threads 1 || return 1
        for file in again/figures/*."$kind"; do
            cmp -s "$file" "$kind/figures/${file##*/}" || return 1
        done
    done
    [ "$(files svg again)" = 0 ] && [ "$(files pdf again)" = 0 ] && listed again
}
ok "the same bytes again, and --overwrite removes the other kinds" again

# What gnuplot drew before shows in the attributes of one group without anything in it.
drawn() {
    sed 's/stroke="[a-zA-Z]*"//' "$1"
}
by_itself() {
    cd svg/figures || return 1
    for script in *.gp; do
        picture=${script%.gp}.svg
        drawn "$picture" >../first && rm "$picture" && gnuplot -d "$script" &&
            drawn "$picture" | cmp -s - ../first || return 1
    done
    rm ../first && cd ../..
}
ok "every script makes its picture by itself" by_itself

kept() {
    echo mine >svg/figures/notes.txt && echo mine >svg/figures/gene-lyra-lags.svg &&
        run 0 run gene.yaml --out svg --overwrite --genes vela &&
        says svg/figures/notes.txt mine && [ ! -e svg/figures/gene-lyra-counts.svg ] &&
        [ -e svg/figures/gene-vela-counts.svg ]
}
ok "--genes, and --overwrite leaves what it did not write" kept
in_the_way() {
    run 0 run gene.yaml --out way --figures none && mkdir way/figures &&
        echo mine >way/figures/gene-vela-counts.csv && run 0 run gene.yaml --out way --overwrite &&
        says err "gene-vela-counts.csv is no file of an earlier run" &&
        says way/figures/gene-vela-counts.csv mine && [ ! -e way/figures/gene-vela-counts.svg ] &&
        [ -e way/figures/gene-vela-dwells.svg ]
}
ok "a figure whose name is taken is left out" in_the_way

# numbers_stand DIR TEXT: the run is whole but for its pictures, and says why
numbers_stand() {
    says err "$2" && [ "$(grep -c "warning: .* could not be drawn" err)" = 1 ] &&
        says "$1/summary.json" '"status": "complete"' && cmp -s "$1/means.csv" png/means.csv &&
        [ "$(files svg "$1")" = 0 ] && [ "$(files gp "$1")" = "$(files gp png)" ] && listed "$1"
}
missing() {
    GNUPLOT=./no-such-program run 0 run gene.yaml --out missing && numbers_stand missing "could not be started"
}
ok "no gnuplot" missing
not_found() {
    mkdir -p empty && PATH=$PWD/empty "$TARRY" run gene.yaml --out not_found >out 2>err &&
        numbers_stand not_found "gnuplot could not be started"
}
ok "no gnuplot in PATH" not_found
failing() {
    fake failing <<'END' || return 1
echo half >gene-vela-traces.svg
echo '"gene-vela-traces.gp" line 7: it is not my day' >&2
exit 3
END
    GNUPLOT=./failing run 0 run gene.yaml --out failed && numbers_stand failed "status 3" &&
        says err "line 7: it is not my day"
}
ok "a gnuplot that fails" failing
killed() {
    fake killed <<'END' || return 1
echo '<svg' >gene-vela-traces.svg
kill -KILL $$
END
    GNUPLOT=./killed run 0 run gene.yaml --out was_killed && numbers_stand was_killed "signal 9"
}
ok "a gnuplot that is killed" killed
idle() {
    fake idle <<'END' || return 1
exit 0
END
    GNUPLOT=./idle run 0 run gene.yaml --out idled && numbers_stand idled "left pictures out"
}
ok "a gnuplot that does nothing" idle
as_asked() {
    fake asked <<'END' || return 1
{ readlink /proc/self/fd/0; echo "$1"; ps -o pgid= -p $$; echo $$; } >"$OLD/asked.out"
END
    OLD=$PWD GNUPLOT=./asked run 0 run gene.yaml --out was_asked
    [ "$(sed -n 1p asked.out)" = /dev/null ] && [ "$(sed -n 2p asked.out)" = -d ]
}
ok "gnuplot has no standard input and does not read the user's settings" as_asked

# Nobody may have asked how it ended.
has_ended() {
    ! kill -0 "$1" 2>/dev/null || grep -q '^State:.*Z' "/proc/$1/status"
}
interrupted() {
    fake slow <<'END' || return 1
sleep 77 &
echo $! >"$OLD/child"
wait
END
    OLD=$PWD GNUPLOT=./slow "$TARRY" run gene.yaml --out stopped >out 2>err &
    program=$!
    comes child || return 1
    kill -TERM "$program" && wait "$program" && numbers_stand stopped "interrupted" &&
        sleep 0.1 && has_ended "$(cat child)"
}
ok "being interrupted ends gnuplot and all that it started" interrupted

# It goes on drawing when the run is killed, and would draw over what the next run has drawn and listed.
outlived() {
    fake orphan <<'END' || return 1
echo $$ >"$OLD/orphan.pid"
for _ in $(seq 300); do
    [ ! -e "$OLD/go" ] || break
    sleep 0.1
done
shift
for script in "$@"; do
    echo "drawn by the dead" >"${script%.gp}.svg"
done
END
    rm -f orphan.pid
    OLD=$PWD GNUPLOT=./orphan "$TARRY" run gene.yaml --out outlived >out 2>err &
    program=$!
    comes orphan.pid || return 1
    kill -KILL "$program"
    wait "$program" 2>/dev/null
    [ -e outlived/unfinished.json ] && run 0 run gene.yaml --out outlived --overwrite || return 1
    ! has_ended "$(cat orphan.pid)" || return 1
    touch go
    for _ in $(seq 100); do
        sleep 0.1
        ! has_ended "$(cat orphan.pid)" || break
    done
    has_ended "$(cat orphan.pid)" && listed outlived && [ "$(files svg outlived)" -ge 15 ] &&
        [ ! -e outlived/unfinished.json ]
}
ok "a gnuplot that outlives a killed run draws over nothing" outlived 2>/dev/null

finish
