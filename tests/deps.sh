#!/bin/sh
# SPDX-License-Identifier: GPL-3.0-or-later
# Find what is missing to build, run, test or check tarry, and install it.
#
#   sh tests/deps.sh GROUP...    groups: build, test, dev
#
# A library is there when a few lines that use it compile and link; a program is there when it is
# found. Nothing is done where all is there. What is missing is installed by apt-get (Debian and its
# kin); elsewhere it is listed, and the script fails.
set -eu

CC=${CC:-cc}
missing=
scratch=$(mktemp -d)
trap 'rm -rf "$scratch"' EXIT
trap 'exit 1' HUP INT TERM

# Remember a package of Debian that is missing, and say why.
lack() {
    case " $missing " in
    *" $1 "*) ;;
    *)
        missing="$missing $1"
        echo "missing: $2 (Debian package $1)" >&2
        ;;
    esac
}

# need_program PACKAGE PROGRAM...
need_program() {
    package=$1
    shift
    for program in "$@"; do
        command -v "$program" >/dev/null 2>&1 || lack "$package" "the program $program"
    done
}

# need_one_of PACKAGE PROGRAM... : any of them will do
need_one_of() {
    package=$1
    shift
    for program in "$@"; do
        command -v "$program" >/dev/null 2>&1 && return
    done
    lack "$package" "the program $1"
}

# need_library PACKAGE WHAT FLAGS, with a few lines of C on standard input
need_library() {
    cat >"$scratch/try.c"
    # The flags are a list of words.
    # shellcheck disable=SC2086
    "$CC" -o "$scratch/try" "$scratch/try.c" $3 >/dev/null 2>&1 || lack "$1" "$2"
}

need_build() {
    if ! command -v "${CC%% *}" >/dev/null 2>&1; then
        lack gcc "a C compiler called $CC"
        lack libc6-dev "the C library's headers"
    fi
    need_program binutils ar
    need_library libc6-dev "the C library's headers" "" <<'END'
#include <stdio.h>
int main(void) { return printf("") != 0; }
END
    need_library libgsl-dev "the library GSL" "-lgsl -lgslcblas -lm" <<'END'
#include <gsl/gsl_sf_gamma.h>
int main(void) { return gsl_sf_gamma(1.0) != 1.0; }
END
    need_library uthash-dev "the header uthash" "" <<'END'
#include <stdlib.h>
#include <uthash.h>
struct entry { int key; UT_hash_handle hh; };
int main(void) { struct entry *all = NULL; return (int)HASH_COUNT(all); }
END
    need_library libyaml-dev "the library libyaml" "-lyaml" <<'END'
#include <yaml.h>
int main(void) { yaml_parser_t parser; return !yaml_parser_initialize(&parser); }
END
    need_library libjansson-dev "the library jansson" "-ljansson" <<'END'
#include <jansson.h>
int main(void) { return json_object() == NULL; }
END
    need_library nettle-dev "the library nettle" "-lnettle" <<'END'
#include <nettle/sha2.h>
int main(void) { struct sha256_ctx context; sha256_init(&context); return 0; }
END
    need_program gnuplot-nox gnuplot # for figures; a run does without
    case $CC in
    *clang*) openmp=libomp-dev ;;
    *) openmp=libgomp1 ;;
    esac
    need_library "$openmp" "OpenMP for $CC" "-fopenmp" <<'END'
#include <omp.h>
int main(void) { return omp_get_max_threads() < 1; }
END
}

need_test() {
    need_library check "the library check" "-lcheck -lsubunit -lm -lrt -lpthread" <<'END'
#include <check.h>
int main(void) { return suite_create("") == NULL; }
END
    need_program libc-bin localedef
    need_program libxml2-utils xmllint
    need_program groff-base groff
    need_one_of chromium chromium chromium-browser google-chrome google-chrome-stable
    version=$("$CC" -dumpversion 2>/dev/null | cut -d. -f1)
    case $CC in
    *clang*) sanitizers=libclang-rt-$version-dev ;;
    *) sanitizers=libgcc-$version-dev ;;
    esac
    need_library "$sanitizers" "the sanitizers of $CC" "-fsanitize=address,undefined" <<'END'
int main(void) { return 0; }
END
}

need_dev() {
    need_program gcc gcc
    need_program binutils objdump
    need_program clang clang
    need_program clang-format clang-format
    need_program clang-tidy clang-tidy
    need_program cppcheck cppcheck
    need_program shellcheck shellcheck
    need_program valgrind valgrind
    if command -v clang >/dev/null 2>&1; then
        version=$(clang -dumpversion | cut -d. -f1)
        CC=clang need_library "libclang-rt-$version-dev" "the sanitizers of clang" "-fsanitize=thread" <<'END'
int main(void) { return 0; }
END
        CC=clang need_library "libclang-rt-$version-dev" "libFuzzer of clang" "-fsanitize=fuzzer,address" <<'END'
#include <stddef.h>
#include <stdint.h>
int LLVMFuzzerTestOneInput(const uint8_t *data, size_t size);
int LLVMFuzzerTestOneInput(const uint8_t *data, size_t size) { return size > 0 && data == NULL; }
END
        CC=clang need_library libomp-dev "OpenMP for clang" "-fopenmp" <<'END'
#include <omp.h>
int main(void) { return omp_get_max_threads() < 1; }
END
    else
        lack libomp-dev "OpenMP for clang"
        lack libclang-rt-dev "the sanitizers of clang"
    fi
}

[ $# -gt 0 ] || set -- build
for group in "$@"; do
    case $group in
    build) need_build ;;
    test) need_test ;;
    dev) need_dev ;;
    *)
        echo "deps.sh: there is no group $group; groups are build, test, dev" >&2
        exit 2
        ;;
    esac
done
[ -n "$missing" ] || exit 0

root=
if [ "$(id -u)" != 0 ]; then
    root=sudo
fi
if ! command -v apt-get >/dev/null 2>&1; then
    echo "error: there is no apt-get here, so nothing was installed." >&2
    echo "Install what is listed above with this system's own tools and try again." >&2
    exit 1
fi
if [ -n "$root" ] && ! command -v sudo >/dev/null 2>&1; then
    echo "error: this needs root, and there is no sudo. Have an administrator run:" >&2
    echo "  apt-get install --no-install-recommends$missing" >&2
    exit 1
fi

apt() {
    $root env DEBIAN_FRONTEND=noninteractive apt-get -q "$@" >&2
}

# Package lists may be missing on a fresh machine, or too old to find their files.
echo "installing:$missing" >&2
updated=no
if ! ls /var/lib/apt/lists/*Packages* >/dev/null 2>&1; then
    apt update
    updated=yes
fi
# The packages are a list of words.
# shellcheck disable=SC2086
if ! apt install -y --no-install-recommends $missing; then
    [ $updated = no ] || exit 1
    apt update
    apt install -y --no-install-recommends $missing
fi

# What was installed must do: look again, and fail where it does not.
missing=
for group in "$@"; do
    "need_$group"
done
if [ -n "$missing" ]; then
    echo "error: still missing after installing:$missing" >&2
    exit 1
fi
