#!/bin/sh
# SPDX-License-Identifier: GPL-3.0-or-later
# shellcheck disable=SC2317 # cases are functions, called by name
# The model format key by key: docs/model.md has a row for every key that the readers know, with the default that
# the program takes, and every key refuses what it cannot be. every_key.yaml says how each is tried.
# shellcheck source=tests/cli/helpers.sh
. "${0%/*}/helpers.sh"
root=${models%/models}
all=$root/tests/cli/every_key.yaml
manual=$root/docs/model.md
cp "$all" every_key.yaml
printf 'value,weight\n1 min,2\n4 min,1\n' >lags.csv

sound() {
    run 0 check every_key.yaml && run 0 run every_key.yaml --cells 2 --out all --figures none
}
ok "a model with every key is sound" sound

# The section of docs/model.md that tells of the keys of a reader.
section_of() {
    case $1 in
    model.c) echo top ;;
    read_parameters.c) echo parameters ;;
    read_delays.c | read_lag_file.c) echo delays ;;
    gene_layout.c | read_genes.c | read_promoter.c) echo genes ;;
    read_reactions.c | read_amounts.c | read_bursts.c) echo reactions ;;
    read_signals.c) echo signals ;;
    protocol_steps.c) echo protocol ;;
    read_run.c | read_limits.c) echo run ;;
    *) echo "$1 has keys, and no section here" ;;
    esac
}

# Lists of words in a reader that are names of keys: each is a table of texts called keys, KEYS, WORDS and so on.
# `FAMILIES` holds the laws with their keys.
known_keys() {
    for file in "$root"/src/model/*.c; do
        awk '/^ *(static )?const (char \*const|family_keys) [A-Za-z_]*\[\] = \{/ &&
                /(keys|KEYS|LATER|WORDS|FAMILIES|of_bins|of_values)\[\]/ { on = 1 }
            on { print }
            /\};/ { on = 0 }' "$file" | grep -o '"[a-z_]*"' | tr -d '"' | sort -u >words
        while IFS= read -r word; do
            echo "$(section_of "$(basename "$file")") $word"
        done <words
    done | sort -u
}

# First columns of the tables of docs/model.md with the section: "run | `cells`"
rows() {
    awk '/^## / { section = tolower($0); sub(/^## /, "", section); sub(/^species and /, "", section)
            sub(/ .*/, "", section) }
        /^\| / && !/^\| (key|law|column|where|---)/ { split($0, part, / \| /); print section " " part[1] }' "$manual"
}

all_told() {
    known_keys >known
    rows >told
    [ "$(wc -l <known)" -ge 90 ] || return 1
    good=true
    while read -r section word; do
        grep -qE "^$section .*(\`$word\`|[\`{ ]$word:)" told && continue
        echo "    no row for '$word' in the section $section"
        good=false
    done <known
    $good
}
ok "docs/model.md has a row for every key that the readers know" all_told

all_tried() {
    good=true
    while read -r section word; do
        case "$section $word" in
        "top fit" | "delays weight" | "delays value") continue ;; # refused whatever it says; columns of lags.csv
        esac
        grep -qE "\b$word: ?.*# $section [|] " "$all" && continue
        echo "    every_key.yaml does not try '$word' ($section)"
        good=false
    done <known
    $good
}
ok "every_key.yaml tries every key that the readers know" all_tried

# with N [VALUE] : every_key.yaml with this value in line N, in place of all that belonged to the key; without a
# value the key is left out.
with() {
    awk -v n="$1" -v value="${2-}" -v leave_out="$((2 - $#))" '
        NR == n {
            match($0, /^[ -]*/)
            deep = RLENGTH
            if (!leave_out)
                print substr($0, 1, index($0, ":")) " " value
            within = 1
            next
        }
        within { match($0, /^[ -]*/); within = RLENGTH > deep }
        !within' "$all"
}

refused() {
    with "$1" "$2" >wrong.yaml
    run 2 check wrong.yaml && grep -q '^tarry: [a-z]*\.yaml:[0-9]*:[0-9]*: ' err && says err "$3"
}

# result NAME : what three cells of model.yaml come to, in NAME
result() {
    sed "s/^  cells: .*/  cells: 3/" model.yaml >few.yaml
    run 0 run few.yaml --figures none --out results --overwrite && cat results/*.csv >"$1"
}

# `check` tells the number of cells; a thousand take too long.
checked() {
    run 0 check model.yaml && cp out "$1"
}

# What a default means where it stands in the file (every_key.yaml).
meaning() {
    case $1 in
    "the first state") echo shut ;;
    "those that initiate") echo "[open]" ;;
    *) printf '%s\n' "$1" | sed 's|until/|60 min / |; s|until|60 min|' ;;
    esac
}

# default_is N SECTION KEY DEFAULT : docs/model.md says so, and the program does so
default_is() {
    grep -qxF "$2 \`$3\` \`$4\`" defaults || {
        echo "    docs/model.md has no row for this key with this default"
        return 1
    }
    look=result
    case $3 in
    cells) look=checked ;;
    firings | pending) # too many to come to
        grep -qi "DEFAULT_$3 = $4[,;]" "$root/src/model/read_limits.c"
        return
        ;;
    memory)
        grep -q "DEFAULT_MEMORY = 4e9;" "$root/src/model/read_limits.c" && [ "$4" = "4 GB" ]
        return
        ;;
    esac
    with "$1" "$(meaning "$4")" >model.yaml && $look given &&
        with "$1" >model.yaml && $look left_out && cmp given left_out
}

# "run `cells` `1000`", for rows with a column of defaults
awk '/^## / { section = tolower($0); sub(/^## /, "", section); sub(/^species and /, "", section)
        sub(/ .*/, "", section) }
    /^\| `/ { split($0, part, / *\| */); print section " " part[2] " " part[4] }' "$manual" >defaults

grep -n '# [a-z]* | .* | .* | ' "$all" >lines
ok "every_key.yaml says how to try its keys" [ "$(wc -l <lines)" -ge 85 ]
while IFS= read -r line; do
    n=${line%%:*}
    text=${line#*:}
    key=$(printf '%s\n' "${text%%:*}" | tr -d ' -')
    how=${text##* # }
    section=${how%% | *}
    rest=${how#* | }
    default=${rest%% | *}
    rest=${rest#* | }
    ok "$section, line $n: $key: ${rest%% | *} is refused" refused "$n" "${rest%% | *}" "${rest#* | }"
    [ "$default" = - ] ||
        ok "$section, line $n: $key is $default where it is left out" default_is "$n" "$section" "$key" "$default"
done <lines
finish
