/* SPDX-License-Identifier: GPL-3.0-or-later */

/* Bounds on expressions by interval arithmetic (Moore 1966, Interval Analysis): each operation maps
 * bounds to bounds that hold whatever values lie within. A species that occurs twice counts as two,
 * so that the bounds may be wider than the truth and never narrower, but for rounding. */

#include "model/analysis.h"
#include "model/program.h"

#include <math.h>

static const tarry_interval anything = {-HUGE_VAL, HUGE_VAL};

static double least_of(double a, double b, double c, double d) {
    return fmin(fmin(a, b), fmin(c, d));
}

static double most_of(double a, double b, double c, double d) {
    return fmax(fmax(a, b), fmax(c, d));
}

/* 0 times infinity is 0 here: infinity stands for counts as large as one likes. */
static double times(double a, double b) {
    return a == 0 || b == 0 ? 0 : a * b;
}

static tarry_interval add(tarry_interval a, tarry_interval b) {
    return (tarry_interval){a.low + b.low, a.high + b.high};
}

static tarry_interval negate(tarry_interval a) {
    return (tarry_interval){-a.high, -a.low};
}

static tarry_interval multiply(tarry_interval a, tarry_interval b) {
    const double w = times(a.low, b.low), x = times(a.low, b.high);
    const double y = times(a.high, b.low), z = times(a.high, b.high);
    return (tarry_interval){least_of(w, x, y, z), most_of(w, x, y, z)};
}

static tarry_interval divide(tarry_interval a, tarry_interval b) {
    if (b.low < 0 && b.high > 0)
        return anything;
    if (b.high <= 0)
        return divide(negate(a), negate(b));
    const tarry_interval inverse = {1 / b.high, b.low > 0 ? 1 / b.low : HUGE_VAL};
    return multiply(a, inverse);
}

static bool is_whole(double x) {
    return floor(x) == x && fabs(x) < 0x1p53;
}

static tarry_interval power(tarry_interval a, tarry_interval n) {
    const bool fixed = n.low == n.high;
    if (a.low >= 0) {
        const double w = pow(a.low, n.low), x = pow(a.low, n.high);
        const double y = pow(a.high, n.low), z = pow(a.high, n.high);
        const tarry_interval out = {least_of(w, x, y, z), most_of(w, x, y, z)};
        return fixed ? out : (tarry_interval){0, HUGE_VAL};
    }
    if (!fixed || !is_whole(n.low) || n.low < 0)
        return fixed && is_whole(n.low / 2) ? (tarry_interval){0, HUGE_VAL} : anything;
    const double x = pow(a.low, n.low), y = pow(a.high, n.low);
    if (is_whole(n.low / 2))
        return (tarry_interval){a.high >= 0 ? 0 : fmin(x, y), fmax(x, y)};
    return (tarry_interval){x, y};
}

/* x^n/(K^n + x^n): between 0 and 1 where x and K are not negative. */
static tarry_interval hill(tarry_interval x, tarry_interval k) {
    return x.low >= 0 && k.low >= 0 ? (tarry_interval){0, 1} : anything;
}

static tarry_interval of_one(uint32_t code, tarry_interval a) {
    switch ((tarry_operation)code) {
    case TARRY_OP_NEGATE:
        return negate(a);
    case TARRY_OP_EXP:
        return (tarry_interval){exp(a.low), exp(a.high)};
    case TARRY_OP_LOG:
        return (tarry_interval){a.low > 0 ? log(a.low) : -HUGE_VAL,
                                a.high > 0 ? log(a.high) : HUGE_VAL};
    case TARRY_OP_SQRT:
        return (tarry_interval){sqrt(fmax(a.low, 0)), sqrt(fmax(a.high, 0))};
    default:
        return anything;
    }
}

static tarry_interval of_two(uint32_t code, tarry_interval a, tarry_interval b) {
    switch ((tarry_operation)code) {
    case TARRY_OP_ADD:
    case TARRY_OP_ADD_CONSTANT:
    case TARRY_OP_ADD_SPECIES:
        return add(a, b);
    case TARRY_OP_SUBTRACT:
    case TARRY_OP_SUBTRACT_CONSTANT:
    case TARRY_OP_SUBTRACT_SPECIES:
        return add(a, negate(b));
    case TARRY_OP_MULTIPLY:
    case TARRY_OP_MULTIPLY_CONSTANT:
    case TARRY_OP_MULTIPLY_SPECIES:
        return multiply(a, b);
    case TARRY_OP_DIVIDE:
    case TARRY_OP_DIVIDE_CONSTANT:
    case TARRY_OP_DIVIDE_SPECIES:
        return divide(a, b);
    case TARRY_OP_POWER:
    case TARRY_OP_POWER_WHOLE:
        return power(a, b);
    case TARRY_OP_MIN:
        return (tarry_interval){fmin(a.low, b.low), fmin(a.high, b.high)};
    case TARRY_OP_MAX:
        return (tarry_interval){fmax(a.low, b.low), fmax(a.high, b.high)};
    case TARRY_OP_HILL_WHOLE:
    case TARRY_OP_REPRESS_WHOLE:
        return hill(a, b);
    default:
        return anything;
    }
}

/* Values that an operation takes from the stack. */
static int n_taken(uint32_t code) {
    static const int takes[] = {
#define TAKES(name, n) n,
        TARRY_OPERATIONS(TAKES)
#undef TAKES
    };
    return takes[code];
}

/* The operand that an instruction carries itself, for those made in folding. */
static tarry_interval carried(const tarry_instruction *step, const double *least) {
    switch ((tarry_operation)step->code) {
    case TARRY_OP_SPECIES:
    case TARRY_OP_ADD_SPECIES:
    case TARRY_OP_SUBTRACT_SPECIES:
    case TARRY_OP_MULTIPLY_SPECIES:
    case TARRY_OP_DIVIDE_SPECIES:
        return (tarry_interval){least ? least[step->index] : 0, HUGE_VAL};
    case TARRY_OP_POWER_WHOLE:
        return (tarry_interval){step->index, step->index};
    case TARRY_OP_PARAMETER:
        return anything;
    default:
        return (tarry_interval){step->value, step->value};
    }
}

tarry_interval tarry_analysis_range(const tarry_expression *expression, const double *least) {
    tarry_interval stack[TARRY_EXPRESSION_DEPTH + 1];
    size_t n = 0;
    for (uint32_t i = 0; i < expression->n_instructions; i++) {
        const tarry_instruction *step = &expression->instructions[i];
        const size_t takes = (size_t)n_taken(step->code);
        const bool own = step->code > TARRY_OP_REPRESS;
        tarry_interval out;
        n -= takes;
        if (takes == 0)
            out = carried(step, least);
        else if (own)
            out = of_two(step->code, stack[n], carried(step, least));
        else if (takes == 1)
            out = of_one(step->code, stack[n]);
        else if (takes == 2)
            out = of_two(step->code, stack[n], stack[n + 1]);
        else
            out = hill(stack[n], stack[n + 1]);
        if (isnan(out.low) || isnan(out.high))
            out = anything;
        stack[n++] = out;
    }
    return n == 1 ? stack[0] : anything;
}
