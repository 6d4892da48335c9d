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

# The first block of YAML in a document.
first_block() {
    awk '/^```yaml$/ && !seen { on = 1; next } /^```$/ { if (on) seen = 1; on = 0 } on' "$1"
}

format() {
    first_block "$root/docs/model.md" >format.yaml && run 0 check format.yaml && says out "No warnings."
}
ok "the model in docs/model.md is sound" format

# Keys that a list called `later` in the reader holds, and those in the table of the document.
not_yet() {
    awk '/(later|LATER)\[\] = \{/ { on = 1 } on { print } /\}/ { on = 0 }' "$root"/src/model/*.c |
        grep -o '"[a-z_]*"' | tr -d '"' | sort -u >refused
    # shellcheck disable=SC2016 # the quotes are those of the document
    sed -n '/^## Not yet/,/^Of the commands/s/^| [^|]* |//p' "$root/docs/model.md" |
        grep -o '`[a-z_]*`' | tr -d '`' | grep -vx noise | sort -u >told
    [ -s refused ] && cmp refused told
}
ok "docs/model.md lists the keys that are not yet" not_yet

options_known() {
    for file in README.md docs/model.md docs/files.md docs/exact.md; do
        # shellcheck disable=SC2013 # options are words
        for option in $(grep -o -- '--[a-z]*' "$root/$file" | sort -u); do
            "$TARRY" help run | grep -qF -- "  $option" || "$TARRY" version "$option" >out || return 1
        done
    done
}
ok "every option that the documents name is there" options_known

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

finish
