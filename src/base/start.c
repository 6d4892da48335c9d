#include "tarry/tarry.h"

#include <gsl/gsl_errno.h>
#include <gsl/gsl_version.h>
#include <jansson.h>
#include <nettle/version.h>
#include <uthash.h>

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

const char *tarry_build(void) {
    return "compiler: " COMPILER "\n"
           "flags: " TARRY_FLAGS "\n"
           "threads: POSIX\n"
           "libraries: GSL " GSL_VERSION ", jansson " JANSSON_VERSION
           ", nettle " TEXT_OF(NETTLE_VERSION_MAJOR) "." TEXT_OF(
               NETTLE_VERSION_MINOR) ", uthash " TEXT_OF(UTHASH_VERSION) ", libyaml\n";
}
