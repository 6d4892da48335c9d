#ifndef TARRY_MODEL_STEADY_H
#define TARRY_MODEL_STEADY_H

#include "model/builder.h"

/* Work out the start of every promoter that says `start: steady`, and refuse cycles of states that
 * take no time. The segments' rates and laws must be known. */
int tarry_steady_starts(tarry_builder *builder, tarry_error *error);

#endif
