# SPDX-License-Identifier: GPL-3.0-or-later
# shellcheck shell=sh
# For the scripts of this folder, which source it: cases that print `ok NAME` or `not ok NAME`.
#
# TARRY is the program (default build/tarry). Every script works in a folder of its own, $work, and
# ends with `finish`, whose status is 0 only where every case passed.

TARRY=${TARRY:-build/tarry}
case $TARRY in
/*) ;;
*) TARRY=$PWD/$TARRY ;;
esac
# shellcheck disable=SC2034 # for those who source this
models=$(cd "${0%/*}/../../models" && pwd) || exit 1
work=$(mktemp -d "${TMPDIR:-/tmp}/tarry-cli-XXXXXX") || exit 1
trap 'rm -rf "$work"' EXIT
cd "$work" || exit 1
n_failed=0

# ok NAME COMMAND... : the case passed if the command is true
ok() {
    name=$1
    shift
    if "$@"; then
        echo "ok $name"
    else
        echo "not ok $name"
        sed 's/^/    out: /' out 2>/dev/null | head -n 5
        sed 's/^/    err: /' err 2>/dev/null | head -n 5
        n_failed=$((n_failed + 1))
    fi
}

# run STATUS ARGUMENTS... : true if the program ends with this status; out and err keep what it said
# (a case that should be refused at once must not run on for hours when it is not)
run() {
    wanted=$1
    shift
    timeout 120 "$TARRY" "$@" >out 2>err </dev/null
    status=$?
    [ "$status" = "$wanted" ] || echo "    status $status instead of $wanted"
    [ "$status" = "$wanted" ]
}

# says FILE TEXT : the text stands in out or err
says() {
    grep -qF -- "$2" "$1"
}

# wrong TEXT ARGUMENTS... : refused with status 2, the text on standard error, nothing on output
wrong() {
    text=$1
    shift
    run 2 "$@" && says err "$text" && [ ! -s out ]
}

# A model whose cells take no time at all, so that many can be asked for.
small_model() {
    cat <<'MODEL'
tarry: 1
time: min
species: {clasp: 14, pin: 9, pair: 0}
reactions:
  bind: {uses: {clasp: 1, pin: 1}, makes: {pair: 1}, rate: 0.4}
  split: {uses: {pair: 1}, makes: {clasp: 1, pin: 1}, rate: 1.5}
run: {cells: 100, until: 1 min, every: 0.5 min, seed: 1}
MODEL
}

# Two genes, one signal, a protocol step and lags that vary: something for every figure.
gene_model() {
    cat <<'MODEL'
tarry: 1
title: It's `touch pwned` $(touch pwned) @model {/Symbol a}_3 "x" \
time: min
genes:
  vela:
    promoter:
      shut: {to: {open: 0.2}}
      open: {to: {shut: 0.5}, initiates: 3}
    transcript:
      stages: {nascent: 2 min, nuclear: {gamma: {mean: 3 min, sd: 1 min}}}
      half_life: 10 min
  lyra:
    promoter:
      shut: {to: {open: 0.3}}
      open: {to: {shut: k_shut}, initiates: 2}
    transcript: {half_life: 5 min}
parameters: {k_shut: 0.6}
signals:
  spot: {of: vela.nascent, noise: 0.2}
  light: {sum: {lyra.transcript: 1}}
protocol:
  - {at: 20 min, set: {k_shut: 0.1}}
run: {cells: 20, settle: 20 min, until: 40 min, every: 0.5 min, snapshots: [0 min, 40 min], seed: 1}
MODEL
}

finish() {
    [ "$n_failed" = 0 ]
    exit
}

# comes FILE: wait until it is there and not empty, a minute at most.
comes() {
    for _ in $(seq 600); do
        [ ! -s "$1" ] || return 0
        sleep 0.1
    done
    return 1
}
