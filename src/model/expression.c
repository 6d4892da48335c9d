/* SPDX-License-Identifier: GPL-3.0-or-later */

/* Recursive descent, by rank: + -, then * /, then unary -, then ^ to the right. The depth of the
 * descent is bounded, so that no text can exhaust the stack.
 *
 * Units are followed along. A part of an expression is NEUTRAL where no unit was given in it (plain
 * numbers, counts of species, values of exp, log, hill and repress): it multiplies without a unit
 * and fits whatever it is added to or wanted for. It is UNKNOWN where a parameter without a unit
 * comes in, which may stand for anything, and KNOWN otherwise. */
#include "model/expression.h"

#include "base/error.h"
#include "base/number.h"
#include "model/lexer.h"
#include "model/program.h"
#include "model/utf8.h"
#include "tarry/word.h"

#include <math.h>
#include <stdarg.h>
#include <stdbool.h>
#include <stdio.h>
#include <string.h>
#include <strings.h>

enum { LONGEST_SHOWN = 60, HIGHEST_EXPONENT = 100, MANY = 1000000 };

typedef enum unit_state { NEUTRAL, UNKNOWN, KNOWN } unit_state;

/* What is known of a part's unit. */
typedef struct unit_type {
    unit_state state;
    int time, length; /* exponents where known */
} unit_type;

/* X(NAME, word, fewest values, most, how it is written) */
#define FUNCTIONS(X)                                                                               \
    X(EXP, "exp", 1, 1, "exp(x)")                                                                  \
    X(LOG, "log", 1, 1, "log(x)")                                                                  \
    X(SQRT, "sqrt", 1, 1, "sqrt(x)")                                                               \
    X(MIN, "min", 2, MANY, "min(a, b)")                                                            \
    X(MAX, "max", 2, MANY, "max(a, b)")                                                            \
    X(HILL, "hill", 3, 3, "hill(x, K, n)")                                                         \
    X(REPRESS, "repress", 3, 3, "repress(x, K, n)")

typedef struct function {
    tarry_operation code;
    const char *word;
    size_t fewest, most;
    const char *usage;
} function;

static const function functions[] = {
#define FUNCTION_ROW(name, word, fewest, most, usage) {TARRY_OP_##name, word, fewest, most, usage},
    FUNCTIONS(FUNCTION_ROW)
#undef FUNCTION_ROW
};

enum { N_FUNCTIONS = sizeof functions / sizeof *functions };

static const char *const function_words[] = {
#define FUNCTION_WORD(name, word, fewest, most, usage) word,
    FUNCTIONS(FUNCTION_WORD)
#undef FUNCTION_WORD
};

typedef struct compiler {
    const char *text;
    size_t size;
    tarry_place place;
    tarry_units units;
    const tarry_scope *scope;
    tarry_token token;    /* the next one */
    tarry_token previous; /* the one taken last */
    int depth;
    tarry_program program;
    tarry_error *error;
} compiler;

static int read_sum(compiler *in, unit_type *type);
static int read_unary(compiler *in, unit_type *type);

/* ---- messages -------------------------------------------------------------------------------- */

static tarry_place place_at(const compiler *in, size_t at) {
    tarry_place place = in->place;
    if (place.line > 0)
        place.column += (int)tarry_utf8_length(in->text, at);
    return place;
}

static int fail_at(compiler *in, size_t at, const char *format, ...)
    __attribute__((format(printf, 3, 4)));

static int fail_at(compiler *in, size_t at, const char *format, ...) {
    char message[sizeof in->error->message];
    va_list arguments;
    va_start(arguments, format);
    vsnprintf(message, sizeof message, format, arguments);
    va_end(arguments);
    return tarry_fail_at(in->error, TARRY_INPUT, place_at(in, at), "%s", message);
}

static int shown(size_t n) {
    return n < LONGEST_SHOWN ? (int)n : LONGEST_SHOWN;
}

/* Fails with what tarry_unit_fail says of a word. */
static int fail_unit(compiler *in, tarry_token word) {
    tarry_error reason;
    tarry_unit_fail(in->text + word.at, word.n, &reason);
    return fail_at(in, word.at, "%s", reason.message);
}

static unit_type type_of(tarry_dimension dimension) {
    if (!dimension.known)
        return (unit_type){UNKNOWN, 0, 0};
    return (unit_type){KNOWN, dimension.time, dimension.length};
}

static tarry_dimension dimension_of(unit_type type) {
    if (type.state != KNOWN)
        return TARRY_ANY;
    return (tarry_dimension){true, (signed char)type.time, (signed char)type.length};
}

static bool is_pure(unit_type type) {
    return type.state != KNOWN || (type.time == 0 && type.length == 0);
}

/* ---- tokens ---------------------------------------------------------------------------------- */

static void advance(compiler *in) {
    in->previous = in->token;
    in->token = tarry_token_read(in->text, in->size, in->token.at + in->token.n);
}

static bool next_is(const compiler *in, char sign) {
    return in->token.kind == TARRY_TOKEN_SIGN && in->token.sign == sign;
}

static bool token_is(const compiler *in, tarry_token token, const char *word) {
    return strlen(word) == token.n && memcmp(in->text + token.at, word, token.n) == 0;
}

static const function *find_function(const compiler *in, tarry_token name) {
    for (size_t i = 0; i < N_FUNCTIONS; i++)
        if (token_is(in, name, functions[i].word))
            return &functions[i];
    return NULL;
}

static void emit(compiler *in, tarry_operation code) {
    tarry_program_add(&in->program, code, 0, 0);
}

/* ---- units ----------------------------------------------------------------------------------- */

/* The unit of parts that are added, compared or chosen from. */
static int unite(compiler *in, tarry_token where, const char *deed, unit_type *type,
                 unit_type other) {
    char one[48], two[48];
    if (type->state == KNOWN && other.state == KNOWN &&
        (type->time != other.time || type->length != other.length))
        return fail_at(in, where.at, "%s and %s cannot be %s",
                       tarry_dimension_text(dimension_of(*type), one),
                       tarry_dimension_text(dimension_of(other), two), deed);
    if (other.state > type->state)
        *type = other;
    return 0;
}

/* The unit of a product (sign 1) or quotient (sign -1). */
static unit_type times(unit_type type, int sign, unit_type other) {
    if (type.state == UNKNOWN || other.state == UNKNOWN)
        return (unit_type){UNKNOWN, 0, 0};
    if (type.state == NEUTRAL && other.state == NEUTRAL)
        return type;
    unit_type result = {KNOWN, type.time + sign * other.time, type.length + sign * other.length};
    bool far = result.time > HIGHEST_EXPONENT || result.time < -HIGHEST_EXPONENT ||
               result.length > HIGHEST_EXPONENT || result.length < -HIGHEST_EXPONENT;
    return far ? (unit_type){UNKNOWN, 0, 0} : result;
}

static int check_pure(compiler *in, tarry_token where, const char *what, unit_type type) {
    char words[48];
    if (is_pure(type))
        return 0;
    return fail_at(in, where.at, "%s is a pure number; here it is %s", what,
                   tarry_dimension_text(dimension_of(type), words));
}

/* The number that the instructions from `from` on stand for, where they are a plain one. */
static bool plain_number(const compiler *in, size_t from, double *value) {
    const tarry_instruction *code = in->program.instructions + from;
    size_t n = in->program.n - from;
    bool negated = n == 2 && code[1].code == TARRY_OP_NEGATE;
    if (in->program.failed || (n != 1 && !negated) || code[0].code != TARRY_OP_CONSTANT)
        return false;
    *value = negated ? -code[0].value : code[0].value;
    return true;
}

/* The unit of a power whose exponent's instructions begin at `from`. */
static int raise(compiler *in, tarry_token where, unit_type *type, unit_type exponent,
                 size_t from) {
    char words[48];
    double n = 0;
    int code = check_pure(in, where, "the exponent of '^'", exponent);
    if (code != 0 || is_pure(*type))
        return code;
    if (!plain_number(in, from, &n) || n != floor(n))
        return fail_at(in, where.at, "%s can be raised to a whole number only, written as digits",
                       tarry_dimension_text(dimension_of(*type), words));
    if (fabs(n) > HIGHEST_EXPONENT)
        n = HIGHEST_EXPONENT;
    unit_type base = {KNOWN, type->time * (int)n, type->length * (int)n};
    *type = times(base, 1, (unit_type){NEUTRAL, 0, 0});
    return 0;
}

/* ---- names ----------------------------------------------------------------------------------- */

/* The nearest name that could have been meant, or NULL. */
static const char *nearest(const compiler *in, tarry_token name) {
    char word[LONGEST_SHOWN + 1];
    if (in->scope == NULL || in->scope->candidates == NULL || name.n > LONGEST_SHOWN)
        return NULL;
    memcpy(word, in->text + name.at, name.n);
    word[name.n] = '\0';
    return tarry_nearest_word(word, in->scope->candidates, in->scope->n_candidates);
}

/* A unit where a value is due. */
static int fail_lone_unit(compiler *in, tarry_token name, tarry_token before) {
    const char *word = in->text + name.at;
    int n = (int)name.n;
    if (before.kind == TARRY_TOKEN_SIGN && before.sign == '/' && before.n > 0)
        return fail_at(in, name.at,
                       "inside an expression a unit follows a number: write '/ 1 %.*s'", n, word);
    return fail_at(in, name.at, "'%.*s' is a unit and follows a number, as in '5 %.*s'", n, word, n,
                   word);
}

/* What the scope has to say of a name that it does not find; 0: nothing. */
static int fail_by_scope(compiler *in, tarry_token name) {
    char word[LONGEST_SHOWN + 1];
    if (in->scope == NULL || in->scope->fail == NULL || name.n > LONGEST_SHOWN)
        return 0;
    memcpy(word, in->text + name.at, name.n);
    word[name.n] = '\0';
    return in->scope->fail(in->scope->context, word, place_at(in, name.at), in->error);
}

/* Words in which programs write what is no number, with a sign or not; YAML has a point before
 * them. */
static bool is_no_number(const char *text, size_t n) {
    static const char *const words[] = {"nan", "inf", "infinity"};
    size_t from = n > 0 && (text[0] == '-' || text[0] == '+');
    from += from < n && text[from] == '.';
    for (size_t i = 0; i < sizeof words / sizeof *words; i++)
        if (strlen(words[i]) == n - from && strncasecmp(text + from, words[i], n - from) == 0)
            return true;
    return false;
}

static int fail_name(compiler *in, tarry_token name, tarry_token before) {
    const char *word = in->text + name.at;
    const function *call = find_function(in, name);
    tarry_unit_fraction unit;
    if (tarry_unit_find(word, name.n, in->units, &unit))
        return fail_lone_unit(in, name, before);
    if (call != NULL)
        return fail_at(in, name.at, "'%s' is a function: write %s", call->word, call->usage);
    if (tarry_unit_is_molar(word, name.n))
        return fail_unit(in, name);
    const int known = fail_by_scope(in, name);
    if (known != 0)
        return known;
    const char *near = nearest(in, name);
    if (is_no_number(word, name.n))
        return fail_at(in, name.at, "a finite number is due here, not '%.*s'", shown(name.n), word);
    if (near != NULL)
        return fail_at(in, name.at, "there is no '%.*s' here; did you mean '%s'?", shown(name.n),
                       word, near);
    return fail_at(in, name.at,
                   "there is no '%.*s' here; a name in an expression is a parameter or a species",
                   shown(name.n), word);
}

static int fail_call(compiler *in, tarry_token name) {
    char word[LONGEST_SHOWN + 1];
    const char *near = NULL;
    uint32_t index = 0;
    tarry_dimension dimension = TARRY_ANY;
    snprintf(word, sizeof word, "%.*s", shown(name.n), in->text + name.at);
    if (in->scope != NULL && in->scope->find(in->scope->context, in->text + name.at, name.n, &index,
                                             &dimension) != TARRY_NAME_UNKNOWN)
        return fail_at(in, in->token.at, "an operator is missing between '%s' and '('", word);
    near = tarry_nearest_word(word, function_words, N_FUNCTIONS);
    if (near != NULL)
        return fail_at(in, name.at, "there is no function '%s'; did you mean '%s'?", word, near);
    return fail_at(
        in, name.at,
        "there is no function '%s'; there are exp, log, sqrt, min, max, hill and repress", word);
}

static int read_name(compiler *in, unit_type *type) {
    tarry_token before = in->previous, name = in->token;
    uint32_t index = 0;
    tarry_dimension dimension = TARRY_ANY;
    tarry_name_kind kind = TARRY_NAME_UNKNOWN;
    advance(in);
    if (next_is(in, '('))
        return fail_call(in, name);
    if (in->scope != NULL)
        kind = in->scope->find(in->scope->context, in->text + name.at, name.n, &index, &dimension);
    if (kind == TARRY_NAME_UNKNOWN)
        return fail_name(in, name, before);
    *type = kind == TARRY_NAME_SPECIES ? (unit_type){NEUTRAL, 0, 0} : type_of(dimension);
    tarry_program_add(&in->program,
                      kind == TARRY_NAME_SPECIES ? TARRY_OP_SPECIES : TARRY_OP_PARAMETER, index, 0);
    return 0;
}

/* ---- values ---------------------------------------------------------------------------------- */

/* A word that follows a number and is no unit. */
static int fail_word_after_number(compiler *in, tarry_token number) {
    uint32_t index = 0;
    tarry_dimension dimension = TARRY_ANY;
    const char *word = in->text + in->token.at;
    if (in->scope == NULL || in->scope->find(in->scope->context, word, in->token.n, &index,
                                             &dimension) == TARRY_NAME_UNKNOWN)
        return fail_unit(in, in->token);
    return fail_at(in, in->token.at, "an operator is missing between '%.*s' and '%.*s'",
                   shown(number.n), in->text + number.at, shown(in->token.n), word);
}

static int read_number(compiler *in, unit_type *type) {
    tarry_token number = in->token;
    tarry_unit_fraction unit = {1, 1, TARRY_ANY};
    double value = 0;
    tarry_number_status status = tarry_number_read(in->text + number.at, number.n, &value);
    advance(in);
    *type = (unit_type){NEUTRAL, 0, 0};
    if (in->token.kind == TARRY_TOKEN_NAME) {
        if (!tarry_unit_find(in->text + in->token.at, in->token.n, in->units, &unit))
            return fail_word_after_number(in, number);
        *type = type_of(unit.dimension);
        advance(in);
    }
    value = value * unit.up / unit.down;
    if (status != TARRY_NUMBER_OK || !isfinite(value))
        return fail_at(in, number.at, "'%.*s' is too large for a number", shown(number.n),
                       in->text + number.at);
    tarry_program_add(&in->program, TARRY_OP_CONSTANT, 0, value);
    return 0;
}

static int close_parenthesis(compiler *in, tarry_token open) {
    if (in->token.kind == TARRY_TOKEN_END)
        return fail_at(in, open.at, "this '(' is not closed; a ')' is missing");
    if (!next_is(in, ')'))
        return fail_at(in, in->token.at, "'%.*s' does not fit here: an operator or ')' is due",
                       shown(in->token.n), in->text + in->token.at);
    advance(in);
    return 0;
}

/* The unit of a call from those of its values, one at a time. */
static int take_value(compiler *in, const function *call, tarry_token where, size_t i,
                      unit_type value, unit_type *type) {
    char what[32], words[48];
    switch (call->code) {
    case TARRY_OP_MIN:
    case TARRY_OP_MAX:
        return unite(in, where, "compared", type, value);
    case TARRY_OP_HILL:
    case TARRY_OP_REPRESS:
        if (i < 2)
            return unite(in, where, "compared", type, value);
        *type = (unit_type){NEUTRAL, 0, 0};
        snprintf(what, sizeof what, "n in %s", call->usage);
        return check_pure(in, where, what, value);
    case TARRY_OP_SQRT:
        *type = value;
        if (value.state == KNOWN && (value.time % 2 != 0 || value.length % 2 != 0))
            return fail_at(in, where.at, "the square root of %s has no meaning here",
                           tarry_dimension_text(dimension_of(value), words));
        type->time /= 2;
        type->length /= 2;
        return 0;
    default:
        snprintf(what, sizeof what, "x in %s", call->usage);
        return check_pure(in, where, what, value);
    }
}

static int fail_count(compiler *in, const function *call, tarry_token name, size_t n) {
    const char *least = call->most > call->fewest ? "at least " : "";
    return fail_at(in, name.at, "'%s' takes %s%zu value%s, not %zu: write %s", call->word, least,
                   call->fewest, call->fewest == 1 ? "" : "s", n, call->usage);
}

static int read_call(compiler *in, const function *call, unit_type *type) {
    tarry_token name = in->previous, open = in->token;
    size_t n = 0;
    *type = (unit_type){NEUTRAL, 0, 0};
    advance(in);
    if (next_is(in, ')'))
        return fail_count(in, call, name, 0);
    for (bool more = true; more; n++) {
        tarry_token where = in->token;
        unit_type value;
        int code = read_sum(in, &value);
        if (code == 0)
            code = take_value(in, call, where, n, value, type);
        if (code != 0)
            return code;
        if (n > 0 && call->fewest < call->most)
            emit(in, call->code);
        more = next_is(in, ',');
        if (more)
            advance(in);
    }
    int code = close_parenthesis(in, open);
    if (code == 0 && (n < call->fewest || n > call->most))
        code = fail_count(in, call, name, n);
    if (code == 0 && call->fewest == call->most)
        emit(in, call->code);
    return code;
}

static int read_group(compiler *in, unit_type *type) {
    tarry_token open = in->token;
    advance(in);
    int code = read_sum(in, type);
    return code != 0 ? code : close_parenthesis(in, open);
}

static int fail_no_value(compiler *in) {
    tarry_token found = in->token, before = in->previous;
    if (is_no_number(in->text, strlen(in->text)))
        return fail_at(in, 0, "a finite number is due here, not '%s'", in->text);
    if (found.kind == TARRY_TOKEN_END && before.n > 0)
        return fail_at(in, before.at, "a value is missing after '%.*s'", shown(before.n),
                       in->text + before.at);
    if (found.kind == TARRY_TOKEN_END)
        return fail_at(in, 0,
                       "a value is missing here: a number, a quantity such as '5 min', or an "
                       "expression");
    if (found.sign == '*' && before.sign == '*')
        return fail_at(in, found.at, "a power is written x^n");
    return fail_at(in, found.at, "a value is due here, not '%.*s'", shown(found.n),
                   in->text + found.at);
}

static int read_primary(compiler *in, unit_type *type) {
    const function *call = NULL;
    if (in->token.kind == TARRY_TOKEN_NUMBER)
        return read_number(in, type);
    if (next_is(in, '('))
        return read_group(in, type);
    if (in->token.kind != TARRY_TOKEN_NAME)
        return fail_no_value(in);
    call = find_function(in, in->token);
    tarry_token after = tarry_token_read(in->text, in->size, in->token.at + in->token.n);
    if (call == NULL || after.kind != TARRY_TOKEN_SIGN || after.sign != '(')
        return read_name(in, type);
    advance(in);
    return read_call(in, call, type);
}

static int read_power(compiler *in, unit_type *type) {
    unit_type exponent;
    int code = read_primary(in, type);
    if (code != 0 || !next_is(in, '^'))
        return code;
    tarry_token where = in->token;
    size_t from = in->program.n;
    advance(in);
    code = read_unary(in, &exponent);
    if (code == 0)
        code = raise(in, where, type, exponent, from);
    if (code == 0)
        emit(in, TARRY_OP_POWER);
    return code;
}

static int read_unary(compiler *in, unit_type *type) {
    if (in->depth == TARRY_EXPRESSION_DEPTH)
        return fail_at(in, in->token.at,
                       "this expression is nested deeper than %d; give a part of it a name under "
                       "'parameters'",
                       (int)TARRY_EXPRESSION_DEPTH);
    in->depth++;
    bool negative = next_is(in, '-');
    if (negative)
        advance(in);
    int code = negative ? read_unary(in, type) : read_power(in, type);
    if (code == 0 && negative)
        emit(in, TARRY_OP_NEGATE);
    in->depth--;
    return code;
}

static int read_product(compiler *in, unit_type *type) {
    int code = read_unary(in, type);
    while (code == 0 && (next_is(in, '*') || next_is(in, '/'))) {
        bool divides = in->token.sign == '/';
        unit_type other;
        advance(in);
        code = read_unary(in, &other);
        if (code != 0)
            return code;
        *type = times(*type, divides ? -1 : 1, other);
        emit(in, divides ? TARRY_OP_DIVIDE : TARRY_OP_MULTIPLY);
    }
    return code;
}

static int read_sum(compiler *in, unit_type *type) {
    int code = read_product(in, type);
    while (code == 0 && (next_is(in, '+') || next_is(in, '-'))) {
        tarry_token where = in->token;
        unit_type other;
        advance(in);
        code = read_product(in, &other);
        if (code == 0)
            code = unite(in, where, where.sign == '+' ? "added" : "subtracted", type, other);
        if (code == 0)
            emit(in, where.sign == '+' ? TARRY_OP_ADD : TARRY_OP_SUBTRACT);
    }
    return code;
}

/* ---- compiling ------------------------------------------------------------------------------- */

static int check_end(compiler *in) {
    tarry_token found = in->token;
    const char *word = in->text + found.at;
    if (found.kind == TARRY_TOKEN_END)
        return 0;
    if (found.sign == ')')
        return fail_at(in, found.at, "this ')' closes no '('");
    if (found.sign == ',')
        return fail_at(in, found.at,
                       "a ',' parts the values of a function and nothing else; decimals are "
                       "written with a point");
    if (found.kind == TARRY_TOKEN_OTHER)
        return fail_at(in, found.at,
                       "'%c' has no meaning in an expression; there are + - * / ^ and parentheses",
                       found.sign);
    return fail_at(in, found.at, "an operator is missing before '%.*s'", shown(found.n), word);
}

static int check_result(compiler *in, tarry_dimension given, tarry_dimension due) {
    char one[48], two[48];
    if (in->program.highest > TARRY_EXPRESSION_DEPTH)
        return fail_at(in, 0,
                       "this expression needs more than %d values at once; give a part of it a "
                       "name under 'parameters'",
                       (int)TARRY_EXPRESSION_DEPTH);
    if (tarry_dimension_fits(given, due))
        return 0;
    return fail_at(in, 0, "'%.*s' is %s where %s is due", shown(in->size), in->text,
                   tarry_dimension_text(given, one), tarry_dimension_text(due, two));
}

static int compile(compiler *in, tarry_dimension due, tarry_arena *arena, tarry_expression *out) {
    unit_type type = {NEUTRAL, 0, 0};
    tarry_expression made = {.place = in->place};
    double value = 0;
    int code = 0;
    if (tarry_quantity_read(in->text, in->size, in->units, &value, &made.dimension)) {
        tarry_program_add(&in->program, TARRY_OP_CONSTANT, 0, value);
    } else {
        advance(in);
        code = read_sum(in, &type);
        if (code == 0)
            code = check_end(in);
        made.dimension = dimension_of(type);
    }
    if (code == 0)
        code = check_result(in, made.dimension, due);
    if (code != 0)
        return code;
    made.text = tarry_arena_text(arena, in->text, in->size);
    if (made.text == NULL)
        return tarry_fail_memory(in->error, "an expression");
    code = tarry_program_finish(&in->program, arena, &made, in->error);
    if (code == 0)
        *out = made;
    return code;
}

int tarry_expression_compile(const char *text, tarry_place place, tarry_dimension due,
                             tarry_units units, const tarry_scope *scope, tarry_arena *arena,
                             tarry_expression *out, tarry_error *error) {
    compiler in = {.text = text,
                   .size = strlen(text),
                   .place = place,
                   .units = units,
                   .scope = scope,
                   .error = error};
    int code = compile(&in, due, arena, out);
    tarry_program_release(&in.program);
    return code;
}

bool tarry_expression_is_reserved(const char *name, size_t n) {
    tarry_unit_fraction unit;
    for (size_t i = 0; i < N_FUNCTIONS; i++)
        if (strlen(functions[i].word) == n && memcmp(functions[i].word, name, n) == 0)
            return true;
    return tarry_unit_find(name, n, (tarry_units){1}, &unit);
}
