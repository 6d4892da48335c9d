#!/bin/sh
# SPDX-License-Identifier: GPL-3.0-or-later
# shellcheck disable=SC2317 # cases are functions, called by name
# Traces that must be the same on every machine and in every later version with the same draws.
#
# stored.csv was written by this program once; it guards against change, not against being wrong from the start: that
# is for the tests against outside sources.
here=$(cd "${0%/*}" && pwd) || exit 1
# shellcheck source=tests/cli/helpers.sh
. "${0%/*}/helpers.sh"

stored() {
    run 0 run "$here/stored.yaml" --keep 3 --threads "$1" --out "stored_$1" &&
        diff "$here/stored.csv" "stored_$1/cells.csv" >out
}
ok "fixed lags and mass action: the stored traces, by one thread" stored 1
ok "fixed lags and mass action: the stored traces, by five threads" stored 5
finish
