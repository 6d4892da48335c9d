/* SPDX-License-Identifier: GPL-3.0-or-later */

#ifndef TARRY_MODEL_PROTOCOL_STEPS_H
#define TARRY_MODEL_PROTOCOL_STEPS_H

/* The entries of `protocol:` as single steps in time: ramps are cut into their parts, repeats are
 * written out. */

#include "model/builder.h"

/* A ramp that begins once. It goes on a straight line through n equal stretches of time: in stretch
 * j = 0 ... n - 1 a parameter has the line's value at the middle of the stretch, and from the end
 * on exactly the value given. */
typedef struct tarry_protocol_ramp {
    const tarry_node *values; /* a map: parameter, value at the end */
    uint32_t n;
    double until;
    double *first, *last; /* of the line, by entry of `values`; known when it begins */
} tarry_protocol_ramp;

typedef struct tarry_protocol_step {
    double at;
    size_t number;             /* in the order of the file, repeats one after the other */
    const tarry_node *set;     /* a map that is not empty, or NULL: */
    tarry_protocol_ramp *ramp; /* in the arena */
    uint32_t part;             /* of the ramp: the stretch that begins; n at its end */
    int line;
} tarry_protocol_step;

typedef TARRY_LIST(tarry_protocol_step) tarry_protocol_steps;

/* All steps in order of time, those of one time in the order of the file but
 * for the ends of ramps, which come first. The list is the caller's
 * to free (`items`), also after an error. */
int tarry_read_protocol_steps(tarry_builder *builder, const tarry_node *list, double until,
                              tarry_protocol_steps *steps, tarry_error *error);

#endif
