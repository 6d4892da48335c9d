#!/bin/sh
# SPDX-License-Identifier: GPL-3.0-or-later
# shellcheck disable=SC2317 # cases are functions, called by name
# make install: the program, the library both ways, and nothing exported but what is promised. The build folder
# is that of the program under test. (Not under sanitizers, which want a program that is built as they are.)
# shellcheck source=tests/cli/helpers.sh
. "${0%/*}/helpers.sh"
if [ -n "${TARRY_TEST_SMALL:-}" ]; then
    echo "skipped: under sanitizers"
    finish
fi
root=${models%/models}
build=${TARRY%/*}
into=$work/into

installed() {
    (cd "$root" && "${MAKE:-make}" -s BUILD="$build" DESTDIR="$into" PREFIX=/opt/tarry install) >out 2>err &&
        "$into/opt/tarry/bin/tarry" version | grep -q '^tarry ' &&
        [ -f "$into/opt/tarry/share/tarry/models/two_state.yaml" ] &&
        [ -f "$into/opt/tarry/share/doc/tarry/model.md" ]
}
ok "make install into a folder" installed
lib=$into/opt/tarry/lib

# field NAME : of the .pc file, with its variables put in
field() {
    sed -n "s/^$1: *//p" "$lib/pkgconfig/tarry.pc" |
        sed "s|\${libdir}|$lib|g; s|\${includedir}|$into/opt/tarry/include|g"
}

# The flags are lists of words.
# shellcheck disable=SC2046,SC2086
shared() {
    ${CC:-cc} -std=c11 $(field Cflags) -o shared "$root/tests/unit/example.c" $(field Libs) >out 2>err &&
        LD_LIBRARY_PATH=$lib ./shared >out 2>err && says out "initiations in a burst" &&
        LD_LIBRARY_PATH=$lib ldd ./shared | grep -q "libtarry.so.0 => $lib"
}
ok "the example with the shared library" shared

# shellcheck disable=SC2046,SC2086
static() {
    ${CC:-cc} -std=c11 $(field Cflags) -o static "$root/tests/unit/example.c" "$lib/libtarry.a" \
        $(field Libs.private) >out 2>err && ./static >out 2>err && says out "initiations in a burst"
}
ok "the example with the static library" static

exports() {
    nm -D --defined-only "$lib/libtarry.so.0" | awk '{ print $3 }' | sort >out
    awk -f "$root/tests/exports.awk" "$into"/opt/tarry/include/tarry/*.h |
        sed -n 's/^ *\(tarry_[a-z0-9_]*\);$/\1/p' | sort >err
    [ "$(wc -l <out)" -gt 30 ] && cmp out err
}
ok "what is exported is what the headers declare" exports

# A user's own names cannot clash: what the static library defines begins with its name.
named() {
    [ -f "$lib/libtarry.a" ] &&
        nm -A --defined-only --extern-only "$lib/libtarry.a" | awk '$NF !~ /^tarry_/ { print }' >out && [ ! -s out ]
}
ok "all names of the static library begin with tarry_" named

gone() {
    (cd "$root" && "${MAKE:-make}" -s BUILD="$build" DESTDIR="$into" PREFIX=/opt/tarry uninstall) >out 2>err &&
        [ -z "$(find "$into" ! -type d)" ]
}
ok "make uninstall" gone
finish
