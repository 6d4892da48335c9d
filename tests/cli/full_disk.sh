#!/bin/sh
# SPDX-License-Identifier: GPL-3.0-or-later
# shellcheck disable=SC2317 # cases are functions, called by name
# A disk that fills up, at whatever place: a small file system in memory where that can be mounted (as
# root; in a name space of mounts, which goes with its shell), and a limit on the size of files.
script=$(cd "${0%/*}" && pwd)/${0##*/}
# shellcheck source=tests/cli/helpers.sh
. "${0%/*}/helpers.sh"
export TARRY
small_model >small.yaml

# write_to FOLDER [OPTION] : a run whose files take some 200 kB; `status` is how it ended
write_to() {
    "$TARRY" run small.yaml --every 0.002 --keep 3 --quiet --threads 1 --out "$@" >out 2>err
    status=$?
}

# refused REASON FOLDER : the run was not written: status 1, the file and the reason, an empty folder
refused() {
    [ "$status" = 1 ] && grep -qF "$2/" err && says err "$1" && [ -z "$(ls -A "$2" 2>/dev/null)" ]
}

# sound FOLDER : the run was written whole
sound() {
    sed -n 's/^ *{"name": "\([^"]*\)", "size": [0-9]*, "sha256": "\([^"]*\)"}.*/\2  \1/p' \
        "$1/summary.json" >list
    [ "$(wc -l <list)" -ge 2 ] && [ ! -e "$1/unfinished.json" ] &&
        (list=$PWD/list && cd "$1" && sha256sum -c --quiet "$list")
}

# The disk grows until all fits; each time before, nothing is left.
growing_disk() {
    mkdir disk && mount -t tmpfs -o size=4k tmpfs disk || return 1
    n_full=0
    for pages in 1 2 3 4 6 8 12 16 32 64 128 256 512 1024; do
        mount -o "remount,size=$((4 * pages))k" disk || return 1
        write_to disk/run
        [ "$status" != 0 ] || break
        refused "No space left on device" disk/run || return 1
        n_full=$((n_full + 1))
    done
    echo "    disks that were too small: $n_full"
    [ "$status" = 0 ] && [ "$n_full" -ge 8 ] && sound disk/run
}

# With figures, of which a part may fit, and a page that is larger than all the rest.
disk_with_figures() {
    gene_model >gene.yaml
    mkdir drawn && mount -t tmpfs -o size=4k tmpfs drawn || return 1
    n_full=0
    for pages in 16 64 100 120 140 160 240 2000; do
        mount -o "remount,size=$((4 * pages))k" drawn || return 1
        "$TARRY" run gene.yaml --quiet --out drawn/run >out 2>err
        status=$?
        [ "$status" != 0 ] || break
        refused "No space left on device" drawn/run || return 1
        n_full=$((n_full + 1))
    done
    echo "    disks that were too small: $n_full"
    [ "$status" = 0 ] && [ "$n_full" -ge 4 ] && sound drawn/run
}

# What cannot be begun changes nothing.
earlier_results_stay() {
    cat /dev/zero >disk/zeroes 2>/dev/null
    cp disk/run/summary.json earlier
    write_to disk/run --overwrite
    [ "$status" = 1 ] && says err "No space left on device" && sound disk/run &&
        cmp -s earlier disk/run/summary.json
}

no_more_files() {
    mkdir few && mount -t tmpfs -o nr_inodes=6 tmpfs few || return 1
    write_to few/run
    refused "No space left on device" few/run
}

# EFBIG, with a signal (SIGXFSZ) that must not end the program. Blocks are of 512 bytes.
limited_files() {
    n_full=0
    for blocks in 1 2 4 8 20 60 200 600 1000 2000 4000; do
        (
            ulimit -f "$blocks"
            write_to limited
            exit "$status"
        )
        status=$?
        [ "$status" != 0 ] || break
        refused "File too large" limited || return 1
        n_full=$((n_full + 1))
    done
    echo "    limits that were too small: $n_full"
    [ "$status" = 0 ] && [ "$n_full" -ge 4 ] && sound limited
}

if [ "${1:-}" = mounting ]; then
    trap 'cd / && umount "$work/disk" "$work/few" "$work/drawn"; rm -rf "$work"' EXIT
    ok "a disk that fills up leaves nothing half-made" growing_disk
    ok "a disk that is full keeps earlier results" earlier_results_stay
    ok "a disk that takes no more files" no_more_files
    ok "a disk that fills up while figures are drawn" disk_with_figures
    finish
fi

# shellcheck disable=SC2016 # for the shell that is started
if [ "$(id -u)" = 0 ] && unshare -m sh -c 'mount -t tmpfs -o size=4k tmpfs "$1"' sh "$work" 2>/dev/null; then
    unshare -m sh "$script" mounting || n_failed=1
else
    echo "    no file system can be mounted here: limits on the size of files stand for it"
fi
ok "files that cannot grow leave nothing half-made" limited_files

# A file must not come to stand in for a stream that is closed: what is said would go into it. While the
# program waits for its model, a pipe, one can see what has the streams' numbers.
closed_streams() {
    mkfifo pipe.yaml
    "$TARRY" run pipe.yaml --out closed <&- >&- 2>&- &
    program=$!
    sleep 0.3
    streams=$(readlink "/proc/$program/fd/0" "/proc/$program/fd/1" "/proc/$program/fd/2" | uniq)
    cat small.yaml >pipe.yaml
    wait "$program"
    [ $? = 1 ] && sound closed && [ "$streams" = /dev/null ]
}
ok "a run whose streams are all closed" closed_streams

long_output_full() {
    [ -c /dev/full ] || return 0
    "$TARRY" check "$models/many_genes.yaml" >/dev/full 2>err
    [ $? = 1 ] && says err "standard output could not be written"
}
ok "long output onto a full disk" long_output_full

finish
