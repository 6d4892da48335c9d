#!/bin/sh
# SPDX-License-Identifier: GPL-3.0-or-later
# shellcheck disable=SC2317 # cases are functions, called by name
# The commands of README.md and of docs are run, and the numbers that README.md shows are among what they print.
# (Some seconds each: too long with sanitizers.)
# shellcheck source=tests/cli/helpers.sh
. "${0%/*}/helpers.sh"
if [ -n "${TARRY_TEST_SMALL:-}" ]; then
    echo "skipped: under sanitizers"
    finish
fi
root=${models%/models}
ln -s "$models" models
mkdir build
ln -s "$TARRY" build/tarry

# command LINE : what follows the prompt, run as a user would
command_runs() {
    sh -c "$1" >>printed 2>err </dev/null
}

# What a page asks to be typed: lines after a prompt, and blocks of shell but for those that say why not:
# `<!-- not run: REASON -->` before them.
typed() {
    awk '/^    \$ / { print substr($0, 7) }
        /^<!-- not run: ..* -->$/ { left_out = 1 }
        /^```$/ { if (on) left_out = 0; on = 0 }
        on && !left_out
        /^```sh$/ { on = 1 }' "$1"
}

: >printed
for page in "$root"/README.md "$root"/DEVELOPERS.md "$root"/docs/*.md; do
    typed "$page" >commands
    while IFS= read -r line; do
        ok "$(basename "$page"): $line" command_runs "$line" </dev/null
    done <commands
done

numbers() {
    grep -E '^    .* (to [0-9.]*|[0-9.]+)$' "$root/README.md" | sed 's/^    //' >shown
    [ "$(wc -l <shown)" -ge 30 ] || return 1
    while IFS= read -r line; do
        grep -qxF -- "$line" printed || {
            echo "    not so: $line"
            return 1
        }
    done <shown
}
ok "the numbers in README.md are those of the program" numbers
finish
