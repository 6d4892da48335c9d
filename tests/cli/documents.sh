#!/bin/sh
# SPDX-License-Identifier: GPL-3.0-or-later
# shellcheck disable=SC2317 # cases are functions, called by name
# What the documents and the example models say is what the program does.
# shellcheck source=tests/cli/helpers.sh
. "${0%/*}/helpers.sh"
root=${models%/models}

for model in "$models"/*.yaml; do
    sound() {
        run 0 check "$model" && says out "No warnings." && head -n 1 "$model" | grep -q '^# ' &&
            sed -n 2p "$model" | grep -q '^# '
    }
    # A gene that is always on has no bursts, and not all of many genes are recorded: each is worth a
    # warning.
    case $model in
    */delayed_feedback.yaml | */many_genes.yaml)
        sound() {
            run 0 check "$model" && says out "Warnings (1)" && head -n 1 "$model" | grep -q "^# " &&
                sed -n 2p "$model" | grep -q "^# "
        }
        ;;
    esac
    ok "$(basename "$model") is sound, and opens with what it shows" sound
done

mkdir pages pages/docs
cp "$root"/README.md "$root"/DEVELOPERS.md pages
cp "$root"/docs/*.md pages/docs

# Blocks of YAML, each in a file of its own: whole.N is a model, part.FRAME.N stands under a line
# `<!-- part: FRAME -->` and is put into that frame; a block that is neither is bare.N.
blocks() {
    awk '/^<!-- part: / { frame = $3 }
        /^```yaml$/ { on = 1; text = ""; next }
        /^```$/ && on {
            name = text ~ /^tarry:/ ? "whole" : frame != "" ? "part." frame : "bare"
            printf "%s", text >(name "." ++n)
            on = 0
            frame = ""
        }
        on { text = text $0 "\n" }' pages/*.md pages/docs/*.md
}

# frame NAME : the model around a part, which is standard input
frame() {
    echo "tarry: 1"
    echo "time: min"
    case $1 in
    top)
        echo "run: {until: 10 min}"
        echo "delays: {folding: 25 min}"
        cat
        return
        ;;
    esac
    echo "run: {until: 10 min}"
    echo "parameters: {k_open: 0.04}"
    echo "genes:"
    echo "  spica: {promoter: {on: {initiates: 1}}, transcript: {half_life: 5 min}, protein: {translation: 1, half_life: 1 h}}"
    echo "  vela:"
    echo "    copies: 2"
    echo "    transcript: {stages: {nascent: 2 min, releasing: 1 min, nuclear: 8 min}, half_life: 35 min}"
    echo "    promoter:"
    case $1 in
    promoter)
        echo "      open: {to: {shut: 0.3}, initiates: 3}"
        sed 's/^/      /'
        ;;
    signals)
        echo "      shut: {to: {open: k_open}}"
        echo "      open: {to: {shut: 0.3}, initiates: 3}"
        echo "signals:"
        sed 's/^/  /'
        ;;
    *) echo "there is no frame '$1'" ;;
    esac
}

blocks
ok "no block of YAML in the documents is neither a model nor marked as part of one" [ "$(echo bare.*)" = "bare.*" ]
for block in whole.* part.*; do
    shown() {
        cp "$block" model.yaml
        case $block in
        part.*) kind=${block#part.} && frame "${kind%.*}" <"$block" >model.yaml ;;
        esac
        run 0 check model.yaml && run 0 run model.yaml --cells 2 --until '60 min' --snapshots '60 min' \
            --settle 0 --figures none --out shown --overwrite
    }
    ok "the block $block of the documents is read and runs" shown
done
whole_sound() {
    for block in whole.*; do
        run 0 check "$block" && says out "No warnings." || return 1
    done
}
ok "nothing looks wrong in models that the documents show" whole_sound

# Rows of the table at the end of docs/model.md: "WHERE | WORD, WORD".
not_yet_rows() {
    # shellcheck disable=SC2016 # the quotes are those of the document
    sed -n '/^## Not yet/,$s/^| \([a-z`-].*\) | \(`.*\) |$/\1 | \2/p' "$root/docs/model.md" | tr -d '`,'
}

refuses() {
    small_model >small.yaml
    case $1 in
    "top level"*) echo "$2: 1" >>small.yaml && run 2 check small.yaml && says err "cannot be used yet" ;;
    --sampler) run 2 run small.yaml --sampler "$2" && says err "cannot be used yet" ;;
    commands) run 2 "$2" small.yaml && says err "not yet" ;;
    *) echo "    no such place: $1" && false ;;
    esac
}

not_yet_rows >rows
ok "docs/model.md has a table of what is not yet" [ "$(wc -l <rows)" = 3 ]
while IFS= read -r row; do
    for word in ${row#* | }; do
        ok "not yet: ${row%% | *} $word" refuses "${row%% | *}" "$word" </dev/null
    done
done <rows

# What the program refuses so, and its sources say: keys, samplers, commands.
all_not_yet() {
    awk '/(later|LATER)\[\] = \{/ { on = 1 } on { print } /\}/ { on = 0 }' "$root"/src/model/*.c "$root"/src/engine/*.c |
        grep -o '"[a-z_]*"' | tr -d '"' >refused
    "$TARRY" help | sed -n 's/^  tarry \([a-z]*\) .*(not yet)$/\1/p' >>refused
    sed 's/.* | //' rows | tr ' ' '\n' | sort >told
    sort refused | cmp - told
}
ok "docs/model.md lists all that is not yet" all_not_yet

options_known() {
    "$TARRY" help run >help_run && "$TARRY" help measure >>help_run || return 1
    for file in README.md docs/model.md docs/files.md docs/data.md docs/exact.md docs/statistics.md docs/reliability.md docs/changes.md; do
        # shellcheck disable=SC2013 # options are words
        for option in $(grep -o -- '--[a-z]*' "$root/$file" | sort -u); do
            [ "$option" = -- ] || grep -qF -- "  $option" help_run || "$TARRY" version "$option" >out || return 1
        done
    done
}
ok "every option that the documents name is there" options_known

# Goals of make: those that the pages name are there, and DEVELOPERS.md tells of all but those that only other goals
# call.
goals() {
    # shellcheck disable=SC2016 # the quotes are those of the documents
    grep -ohE '(`|^    )make [a-z-]+(`| |$)' pages/*.md pages/docs/*.md | sed 's/.*make //; s/[` ].*//' | sort -u >named
    # shellcheck disable=SC1003 # it is a backslash that goes
    sed -n '/^\.PHONY:/,/[^\\]$/p' "$root/Makefile" | tr -d '\\' | sed 's/^\.PHONY://' | tr -s ' ' '\n' |
        grep -v '^$' | sort >there
    comm -23 named there >missing
    comm -13 named there | grep -vxE 'all|tests|tests-slow|everything|list-tests|list-tests-slow|deps-test|shared|FORCE' >>missing
    sed 's/^/    /' missing
    [ "$(wc -l <named)" -ge 15 ] && [ ! -s missing ]
}
ok "the documents name the goals of make, and none that is not there" goals

# Files and folders in quotes, links and pictures. What holds capitals stands for several (test_NAME.c).
places() {
    # shellcheck disable=SC2016 # the quotes are those of the documents
    {
        grep -ohE '`(src|tests|docs|models|include)/[^` ]*`' pages/*.md pages/docs/*.md | tr -d '`'
        grep -ohE '`(base|model|engine|tally|exact|study|report|cli)/[^` ]*`' pages/*.md pages/docs/*.md | tr -d '`' | sed 's|^|src/|'
        grep -ohE '\]\([^)#:]*' pages/README.md pages/DEVELOPERS.md | sed 's/^](//'
        grep -ohE '\]\([^)#:]*' pages/docs/*.md | sed 's|^](|docs/|'
    } |
        grep -v '[A-Z]\{4\}' | grep -vx 'src/fit' | sort -u >named
    [ "$(wc -l <named)" -ge 50 ] || return 1
    good=true
    while IFS= read -r place; do
        # Some are patterns, and base/number stands for its header.
        # shellcheck disable=SC2086
        set -- "$root"/$place
        [ -e "$1" ] || [ -e "$root/$place.h" ] && continue
        echo "    there is no $place"
        good=false
    done <named
    $good
}
ok "every file that the documents name is there" places

files_told() {
    run 0 run "$models/two_colours.yaml" --cells 20 --out all --keep 1 || return 1
    for file in all/*; do
        says "$root/docs/files.md" "$(basename "$file")" || return 1
    done
    for file in all/*.csv; do
        [ "$file" = all/cells.csv ] && continue
        columns=$(head -n 1 "$file" | sed 's/,/, /g')
        grep -qF "| \`$(basename "$file")\` | $columns |" "$root/docs/files.md" || return 1
    done
}
ok "docs/files.md names every file and its columns" files_told

# The picture of the way of the data: every folder of src is in it, and none that is not there.
picture() {
    xmllint --noout "$root/docs/data_way.svg" || return 1
    grep -o 'class="folder"[^>]*>[a-z]*' "$root/docs/data_way.svg" | sed 's/.*>//' | sort -u >drawn
    for folder in "$root"/src/*; do
        basename "$folder"
    done | sort | cmp - drawn
}
ok "the picture of the data's way names the folders of src" picture

# The reading order: at most eight files.
reading_order() {
    sed -n '/^## Where to start reading/,$p' "$root/docs/architecture.md" | grep -c '^[0-9]\. `' >n_files
    [ "$(cat n_files)" -ge 5 ] && [ "$(cat n_files)" -le 8 ]
}
ok "docs/architecture.md has a reading order of at most eight files" reading_order

# Numbers in docs/reliability.md that can be counted: cases, and the stored instructions per event.
counted() {
    set -- "$root"/tests/cli/*.case
    says "$root/docs/reliability.md" "$# one-file cases" || return 1
    grep -v '^#' "$root/tests/bench/instructions" >stored
    while read -r case _ figure; do
        grep "^| ($case) " "$root/docs/reliability.md" | grep -qF "| $(LC_ALL=C awk -v x="$figure" 'BEGIN { printf "%.0f", x }') |" || return 1
    done <stored
    [ -s stored ]
}
ok "docs/reliability.md has the numbers of cases and of instructions" counted

finish
