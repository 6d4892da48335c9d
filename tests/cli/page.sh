#!/bin/sh
# SPDX-License-Identifier: GPL-3.0-or-later
# shellcheck disable=SC2317 # cases are functions, called by name
# report.html: sound markup that fetches nothing, the command it tells, and how a browser shows it, on
# a narrow and a wide screen, light and dark.
# shellcheck source=tests/cli/helpers.sh
. "${0%/*}/helpers.sh"
tests=${models%/models}/tests/cli

# text XPATH FILE: what an element says
text() {
    xmllint --xpath "string($1)" "$2"
}

# A model whose words try to be markup, to run and to turn around, and whose name needs quotes.
hostile="it's <small>.yaml"
{
    # shellcheck disable=SC1003 # a backslash in YAML
    printf 'tarry: 1\ntitle: "</title><script>document.title = 1</script> & \\"x\\" %s"\n' "$(printf '\342\200\256')"
    printf 'time: min\n# </code></pre><script>console.error(1)</script> &lt; %s\n' "$(printf '\342\200\256')"
    printf 'parameters: {k_open: 0.04, k_shut: 0.35}\n'
    cat <<'MODEL'
genes:
  a_gene_whose_name_is_so_long_that_it_fits_into_no_column_of_a_narrow_screen_at_all:
    promoter:
      shut: {to: {open: k_open}}
      open: {to: {shut: k_shut}, initiates: 2}
    transcript: {half_life: 35 min}
run: {cells: 9, until: 60, every: 1, windows: {first: [0, 20], second: [20, 40], third: [40, 60]}}
MODEL
} >"$hostile"

made() {
    run 0 run "$models/two_state.yaml" --cells 40 --settle "1 h" --until "2 h" --snapshots "1 h,2 h" --out two &&
        says err "page: two/report.html" &&
        run 0 run "$hostile" --set "k_open=k_shut * (1 + 1)" --seed 5 --out hostile/ && says err "page: hostile/report.html" &&
        run 0 run "$models/many_genes.yaml" --cells 2 --settle 0 --until "10 min" --out many &&
        run 0 run "$models/induction.yaml" --cells 20 --out steps && run 0 predict "$models/two_state.yaml" --out exact
}
ok "runs and predictions write a page, and say where" made

sound() {
    for page in */report.html; do
        xmllint --noout "$page" >out 2>err && [ ! -s err ] || return 1
    done
}
ok "every page is well-formed XML too" sound

# Names of namespaces are no addresses.
nothing_fetched() {
    for page in */report.html; do
        sed 's/xmlns\(:[a-z]*\)\{0,1\}="[^"]*"//g' "$page" >plain
        grep -niE 'https?:|//[a-z]|url\( *[^#" ]|src=|href="[^#]|@import|<(link|img|iframe|object|embed|form|base)\b' plain >out && return 1
    done
    [ -f two/report.html ]
}
ok "no page names anything outside itself" nothing_fetched

model_text() {
    text '//*[@id="model"]//code' two/report.html >shown && cmp "$models/two_state.yaml" shown >out 2>&1 && return 0
    # xmllint ends what it prints with a line end.
    { cat "$models/two_state.yaml" && echo; } | cmp - shown
}
ok "the model stands in the page as it was" model_text

# The digest that is told, by another program's reckoning.
digest() {
    told=$(text '//*[@class="digest"]/code' hostile/report.html)
    [ "$told" = "$(sha256sum "$hostile" | cut -d ' ' -f 1)" ]
}
ok "the digest is that of the model's text" digest

again() {
    mkdir again && cp "$hostile" again && (
        cd again || exit 1
        tarry() { "$TARRY" "$@" --out again >out 2>err; }
        # The command is ours, but for what it quotes.
        eval "$(text '//*[@class="command"]/code' ../hostile/report.html)"
    ) || return 1
    for file in hostile/*.csv; do
        cmp "$file" "again/again/${file#hostile/}" || return 1
    done
}
ok "the command on the page repeats the run" again

# A number of the sentences, from the file: 60 times the openings a minute.
told_number() {
    wanted=$(awk -F, '$3 == "burst_frequency" { print $5 * 60 }' two/bursts.csv)
    told=$(text '(//*[@class="told"]/b)[1]' two/report.html | sed 's/[^0-9.].*//')
    awk -v wanted="$wanted" -v told="$told" 'BEGIN { exit !(told > 0 && (told - wanted) ^ 2 < (0.006 * wanted) ^ 2) }'
}
ok "the page tells openings an hour as the file tells them a minute" told_number

interrupted() {
    sed 's/cells: 9/cells: 100000000/' "$hostile" >long.yaml
    timeout --foreground --preserve-status -s INT 1 "$TARRY" run long.yaml --out part >out 2>err
    [ $? = 3 ] && grep -q "Partial run." part/report.html && grep -q "This run was interrupted" part/report.html &&
        text '//*[@class="command"]/code' part/report.html | grep -qF -- "--cells $(sed -n 's/^  "cells": \([0-9]*\),.*/\1/p' part/summary.json) "
}
ok "the page of an interrupted run says so, and tells the command of what was done" interrupted

short() {
    run 0 run "$hostile" --cells 3 "$@"
}
without_pictures() {
    short --figures none --out none && ! grep -q "<figure" none/report.html && says none/report.html "(--figures none)" &&
        text '//*[@class="command"]/code' none/report.html | grep -q -- " --figures none$" &&
        GNUPLOT=$work/none short --out missing && ! grep -q "<figure" missing/report.html &&
        says missing/report.html "Figures could not be drawn"
}
ok "a page without pictures says why" without_pictures

other_kinds() {
    short --figures pdf --out pdf && [ "$(grep -c "<figure" pdf/report.html)" = "$(find pdf/figures -name '*.pdf' | wc -l)" ] &&
        grep -q "<svg" pdf/report.html
}
ok "the page has its pictures also where the folder has others" other_kinds

# ---- in a browser: not again with sanitizers, which it has nothing to do with

find_browser() {
    for name in chromium chromium-browser google-chrome google-chrome-stable; do
        command -v "$name" && return 0
    done
    return 1
}

# A copy of a page, free to run scripts, that measures itself and tells the page around it.
measured() {
    sed '/<meta http-equiv="Content-Security-Policy"/d; /<\/body>/d' "$1/report.html" &&
        printf '<script>\nconst page = "%s";\n' "$1" && cat "$tests/page_measure.js" && printf '</script>\n</body>\n</html>\n'
}

frames() {
    printf '<!DOCTYPE html>\n<meta charset="utf-8"><pre id="told"></pre>\n<script>\n'
    printf 'addEventListener("message", function (e) { told.textContent += e.data + "\\n"; });\n'
    printf 'console.error("the console is heard");\n</script>\n'
    for page in two hostile many steps exact; do
        for width in 360 1280; do
            printf '<iframe src="measured-%s.html" style="width:%spx;height:900px"></iframe>\n' "$page" "$width"
        done
        printf '<iframe src="%s/report.html"></iframe>\n' "$page"
    done
}

# show SCHEME NUMBER: what the pages tell of themselves goes to SCHEME.told, the console to SCHEME.err
show() {
    HOME=$work timeout 60 "$browser" --headless --no-sandbox --disable-gpu --no-first-run --user-data-dir="$work/profile" \
        --blink-settings=preferredColorScheme="$2" --enable-logging=stderr --virtual-time-budget=10000 \
        --dump-dom "file://$work/frames.html" >"$1.dom" 2>"$1.err" </dev/null
    sed -n '/<pre id="told">/,/<\/pre>/p' "$1.dom" | sed 's/<[^>]*>//g' >"$1.told"
    [ "$(grep -c ' done$' "$1.told")" = 10 ]
}

shown() {
    browser=$(find_browser) || {
        echo "    no chromium was found (make deps-test installs it)"
        return 1
    }
    for page in two hostile many steps exact; do
        measured "$page" >"measured-$page.html" || return 1
    done
    frames >frames.html
    show light 1 && show dark 0
}

quiet_console() {
    for scheme in light dark; do
        grep CONSOLE "$scheme.err" | grep -v "the console is heard" >out && return 1
        grep CONSOLE "$scheme.err" | grep -q "the console is heard" || return 1
    done
}

# nothing PATTERN: no page tells of it
nothing() {
    ! grep -h -- "$1" light.told dark.told >out
}

# Light is light and dark is dark; text has the contrast that WCAG 2.1 asks for (1.4.3: 4.5).
schemes() {
    grep -q " paper light" light.told && grep -q " paper dark" dark.told && ! grep -q " paper dark" light.told &&
        ! grep -q " paper light" dark.told && nothing " faint"
}

# As many pictures as the folder has, a dozen of two_state.yaml, each of some size and with words instead.
pictures() {
    for page in two hostile many steps; do
        n=$(find "$page/figures" -name '*.svg' 2>/dev/null | wc -l)
        [ "$(grep -c "^$page 360 picture" light.told)" = "$n" ] || {
            echo "    $page: not $n pictures"
            return 1
        }
    done
    [ "$(grep -c "^two 360 picture" dark.told)" -ge 10 ] && nothing " picture without"
}

if [ -z "${TARRY_TEST_SMALL:-}" ]; then
    ok "a browser shows the pages" shown
    ok "nothing is said on its console, and nothing asked for" quiet_console
    ok "no page is wider than a narrow screen" nothing " too wide"
    ok "light and dark, with text that can be read" schemes
    ok "every picture is there, with a text for those who cannot see it" pictures
    ok "links lead somewhere, and names are given once" nothing " link\| twice"
    ok "no script but the page's own" nothing " script"
    ok "the table of all genes sorts" grep -q "^many 1280 sorted" light.told
fi

finish
