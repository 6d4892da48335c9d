/* SPDX-License-Identifier: GPL-3.0-or-later */

#include "tarry/tarry.h"

#include "base/text.h"

#include <gsl/gsl_errno.h>
#include <gsl/gsl_version.h>
#include <jansson.h>
#include <nettle/version.h>
#include <uthash.h>
#include <yaml.h>

#define QUOTE(x) #x
#define TEXT_OF(x) QUOTE(x)

#if defined __clang__
#define COMPILER "clang " __clang_version__
#elif defined __GNUC__
#define COMPILER "gcc " __VERSION__
#else
#define COMPILER "unknown compiler"
#endif

/* The Makefile hands over the flags it compiles with. */
#ifndef TARRY_FLAGS
#define TARRY_FLAGS "not known"
#endif

void tarry_start(void) {
    gsl_set_error_handler_off();
}

const char *tarry_version(void) {
    return TARRY_VERSION;
}

char *tarry_build(void) {
    tarry_text text = {0};
    tarry_text_printf(
        &text,
        "compiler: %s\nflags: %s\nthreads: POSIX\nlibraries: GSL %s, jansson %s, nettle %d.%d, "
        "uthash %s, libyaml %s\n",
        COMPILER, TARRY_FLAGS, GSL_VERSION, JANSSON_VERSION, NETTLE_VERSION_MAJOR,
        NETTLE_VERSION_MINOR, TEXT_OF(UTHASH_VERSION), yaml_get_version_string());
    if (text.failed)
        tarry_text_release(&text);
    return text.data;
}
