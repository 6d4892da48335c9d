/* SPDX-License-Identifier: GPL-3.0-or-later */

#ifndef TARRY_MODEL_BUILDER_H
#define TARRY_MODEL_BUILDER_H

/* The workshop between the tree of a model file and the flat network.
 *
 * Readers, one for each part of the file, turn names into indices and put rows into growing lists;
 * tarry_finish() works out what depends on the whole (values for each segment, affected reactions,
 * dependents) and moves the lists into the model's arena. tarry_model_read calls, in this order:
 *
 *   tarry_read_parameters   names, expressions, values before any step
 *   tarry_read_delays       named delays
 *   tarry_declare_genes     names of genes, states, stages and products: from here on an expression
 *   tarry_declare_species   may name any species, wherever in the file it is made
 *   tarry_read_genes        promoters, tracks, reactions and lags of genes
 *   tarry_read_reactions    plain reactions and the starts of plain species
 *   tarry_read_bursts       named tracks
 *   tarry_read_signals
 *   tarry_read_protocol     segments and settings
 *   tarry_read_run          plan, windows, limits, channels; puts -settle into segments[0].start
 *   tarry_finish
 *   tarry_settle            with `settle: auto`, the time to settle from the finished network
 *
 * A reader gets the whole file by `root` and looks for its own keys; where they are missing it
 * leaves its lists empty or puts in the defaults. Texts, expressions and small arrays that last
 * live in `arena`. Whatever a reader leaves half done, tarry_builder_release frees. */

#include "base/notes.h"
#include "model/expression.h"
#include "model/model.h"
#include "model/network.h"
#include "model/yaml.h"

/* ---- growing lists -------------------------------------------------------------------------- */

/* A heap array that grows; zero-initialise. */
#define TARRY_LIST(type)                                                                           \
    struct {                                                                                       \
        type *items;                                                                               \
        size_t n;                                                                                  \
        size_t capacity;                                                                           \
        void *room; /* scratch of TARRY_APPEND */                                                  \
    }

/* Room for one more element: the array, moved where need be, or NULL (then `items` still holds). */
void *tarry_list_room(void *items, size_t n, size_t *capacity, size_t size);

/* Append a value (use TARRY_APPEND(&list, ((type){...})) for a literal). 0, or 1 without memory. */
#define TARRY_APPEND(list, value)                                                                  \
    (((list)->room = tarry_list_room((list)->items, (list)->n, &(list)->capacity,                  \
                                     sizeof *(list)->items)) == NULL                               \
         ? 1                                                                                       \
         : ((list)->items = (list)->room, (list)->items[(list)->n++] = (value), 0))

/* ---- names ---------------------------------------------------------------------------------- */

typedef enum tarry_symbol_kind {
    TARRY_SYMBOL_PARAMETER,  /* index into parameters */
    TARRY_SYMBOL_SPECIES,    /* into species; hidden ones have no symbol */
    TARRY_SYMBOL_SIGNAL,     /* into signals */
    TARRY_SYMBOL_GENE,       /* into genes */
    TARRY_SYMBOL_LIKE_GENES, /* into like_genes: the name that many genes have in common */
    TARRY_SYMBOL_BURSTS,     /* into genes too: a named track */
    TARRY_SYMBOL_DELAY,      /* into delays */
    TARRY_SYMBOL_REACTION,   /* of `reactions:`, into reactions */
    TARRY_N_SYMBOL_KINDS,
} tarry_symbol_kind;

/* Names of one space are made once. */
typedef enum tarry_symbol_space {
    TARRY_SPACE_VALUES, /* parameters, species, signals, genes */
    TARRY_SPACE_BURSTS,
    TARRY_SPACE_DELAYS,
    TARRY_SPACE_REACTIONS,
    TARRY_N_SYMBOL_SPACES,
} tarry_symbol_space;

typedef struct tarry_symbol tarry_symbol;

/* ---- what has a value in each segment ------------------------------------------------------- */

typedef struct tarry_builder_parameter {
    const char *name;
    tarry_expression expression; /* of other parameters, or the override in its place */
    tarry_dimension dimension;
    const tarry_node *varies; /* the law of the factor by which cells differ, or NULL */
    const char *root;         /* a parameter that varies and that it depends on, or NULL */
    tarry_place place;
} tarry_builder_parameter;

/* A rate or a mean: an expression of parameters alone, worked out for each segment. */
typedef struct tarry_source {
    tarry_expression expression;
    bool half_life;   /* the rate is log(2) / value */
    double least;     /* the smallest value allowed: 0 (or a random amount's least) */
    const char *what; /* whose rate or mean, for messages: "bind" */
} tarry_source;

/* A law whose parameters are expressions: a tarry_law is made of it for each segment. */
typedef struct tarry_law_template {
    tarry_law_kind kind;
    const tarry_expression *a; /* as in tarry_law; NULL where the kind has none */
    const tarry_expression *b;
    size_t n;
    const tarry_expression *points;         /* n, or n + 1 for BINS; NULL */
    const tarry_expression *weights;        /* n, of any sum; NULL */
    const struct tarry_law_template *parts; /* n; NULL */
    uint32_t n_laws;                        /* elementary laws in it, itself included */
    tarry_place place;
} tarry_law_template;

/* A named delay may be made of others in any order. */
typedef enum tarry_delay_state {
    TARRY_DELAY_UNREAD,
    TARRY_DELAY_READING, /* met again in this state it would hold itself */
    TARRY_DELAY_READ,
} tarry_delay_state;

typedef struct tarry_builder_delay {
    const char *name; /* as named, or the law's word when written in place */
    tarry_law_template law;
    tarry_delay_state state;
    const tarry_node *node; /* as written */
} tarry_builder_delay;

/* A number that is used as it stands before any step; a step that would change it is an error. */
typedef struct tarry_builder_constant {
    tarry_expression expression;
    const char *what;
} tarry_builder_constant;

/* ---- effects in the making ------------------------------------------------------------------ */

typedef struct tarry_draft {
    TARRY_LIST(tarry_demand) demands;
    TARRY_LIST(tarry_change) changes; /* any order, species may come several times */
    TARRY_LIST(tarry_amount) amounts;
    TARRY_LIST(tarry_mark_rule) marks; /* COUNT before OPEN and CLOSE */
    TARRY_LIST(uint32_t) schedules;
    bool skip_short;
} tarry_draft;

/* A way out of a promoter state; those of a gene's first allele stand for all. */
typedef struct tarry_builder_move {
    uint32_t gene;
    uint32_t from, to; /* numbers of states */
    bool timed;        /* the state lasts, and `share` of its ends lead here; else at a rate */
    double share;
    bool formula;   /* the rate reads species */
    uint32_t rate;  /* index into formulas or rates */
    bool initiates; /* a transcript is started by the move itself */
    bool waits;     /* it initiates, and so is held back while the allele clears */
    tarry_place place;
} tarry_builder_move;

/* ---- genes as listed --------------------------------------------------------------------------
 */

typedef struct tarry_gene_entry {
    tarry_entry entry;  /* its key is the gene's own name */
    const char *common; /* the name of the entry that stands for many, or NULL */
} tarry_gene_entry;

typedef struct tarry_like_genes {
    const char *name;
    uint32_t first, n; /* genes */
} tarry_like_genes;

typedef struct tarry_shared tarry_shared;

/* ---- the builder ---------------------------------------------------------------------------- */

typedef struct tarry_builder {
    tarry_model *model;
    tarry_arena *arena;     /* the model's */
    tarry_network *network; /* the model's: title, time_unit and run are filled in place */
    const tarry_node *root; /* a map */
    const tarry_override *overrides;
    size_t n_overrides;
    tarry_units units;

    tarry_symbol *symbols[TARRY_N_SYMBOL_SPACES]; /* by uthash */
    tarry_scope scope; /* of parameters and species; its context is the builder */
    TARRY_LIST(const char *) names[TARRY_N_SYMBOL_KINDS]; /* by kind, in the order made */
    TARRY_LIST(const char *) candidates;                  /* parameters and species */

    TARRY_LIST(tarry_builder_parameter) parameters;
    double *values;  /* of parameters before any step, by tarry_read_parameters, in the arena */
    uint32_t *order; /* of parameters: each after those it reads, by tarry_read_parameters */

    TARRY_LIST(tarry_source) rates;
    TARRY_LIST(tarry_source) means;
    TARRY_LIST(tarry_expression) formulas;
    TARRY_LIST(tarry_builder_delay) delays;
    TARRY_LIST(tarry_builder_constant) constants;

    TARRY_LIST(tarry_species) species;
    TARRY_LIST(int32_t) stage_lags; /* by species: the lag that its molecules spend, or NONE */
    TARRY_LIST(tarry_reaction) reactions;
    TARRY_LIST(tarry_effect) effects; /* `affected` is left to tarry_finish */
    TARRY_LIST(tarry_lag) lags;       /* `ramps` is left to tarry_finish */
    TARRY_LIST(tarry_change) changes;
    TARRY_LIST(tarry_demand) demands;
    TARRY_LIST(tarry_amount) amounts;
    TARRY_LIST(tarry_mark_rule) marks;
    TARRY_LIST(uint32_t) schedules;
    TARRY_LIST(tarry_outcome) outcomes;
    TARRY_LIST(tarry_factor) factors;

    TARRY_LIST(tarry_promoter) promoters;
    TARRY_LIST(tarry_promoter_state) states;
    TARRY_LIST(tarry_builder_move) moves; /* by gene */
    TARRY_LIST(tarry_track) tracks;
    TARRY_LIST(tarry_gene) genes;
    TARRY_LIST(tarry_gene_entry) gene_entries; /* by gene */
    TARRY_LIST(tarry_like_genes) like_genes;
    const char *common, *own; /* names of the like gene that is read (like_genes.h), or NULL */
    tarry_shared *shared;     /* what like genes have in common, by node */
    TARRY_LIST(uint32_t) gene_species; /* by gene: the first of its species */
    TARRY_LIST(uint32_t) products;

    TARRY_LIST(tarry_signal) signals; /* `ramps` is left to tarry_finish */
    TARRY_LIST(tarry_weight) weights;
    TARRY_LIST(tarry_ramp) ramps; /* in order of signals */

    TARRY_LIST(tarry_segment) segments; /* start, parameters, settings, text; at least one */
    TARRY_LIST(tarry_setting) settings;
    TARRY_LIST(tarry_response) responses;
    TARRY_LIST(tarry_first) firsts;
    TARRY_LIST(tarry_channel) channels;
} tarry_builder;

/* Prepare; `model` holds arena and file name, `root` is a map, the unit of time is known. */
void tarry_builder_init(tarry_builder *builder, tarry_model *model, const tarry_node *root,
                        tarry_units units);
void tarry_builder_release(tarry_builder *builder);

/* ---- names: making and finding -------------------------------------------------------------- */

/* A name that the user may give: letters, digits, underscores, first a letter; no unit, function or
 * reserved word. `what` for messages: "a parameter". */
int tarry_builder_check_name(const char *name, tarry_place place, const char *what,
                             tarry_error *error);

/* Enter a name (kept as it is, must last). TARRY_INPUT when its space holds it already, and where a
 * delay would be called as a parameter or named bursts as a gene. */
int tarry_builder_enter(tarry_builder *builder, tarry_symbol_kind kind, const char *name,
                        uint32_t index, tarry_place place, tarry_error *error);

/* The index of a name of this kind, or TARRY_NONE. */
int32_t tarry_builder_find(const tarry_builder *builder, tarry_symbol_kind kind, const char *name);

/* The nearest name of any kind in a set of bits (1u << kind), or NULL. */
const char *tarry_builder_nearest(const tarry_builder *builder, unsigned kinds, const char *name);

/* Find, or TARRY_INPUT: "no species is called 'x'; did you mean 'y'?". */
int tarry_builder_need(const tarry_builder *builder, tarry_symbol_kind kind, const char *name,
                       tarry_place place, uint32_t *index, tarry_error *error);

/* The number of a state of a gene by its bare name ("open"), or TARRY_NONE. */
int32_t tarry_builder_state(const tarry_builder *builder, uint32_t gene, const char *state);

/* ---- values: making indices of scalars ------------------------------------------------------ */

/* An expression of parameters alone: compiled and put into the arena. A species in it is an error.
 * `what` ("the mean of a delay") must last where a function keeps it. */
int tarry_builder_expression(tarry_builder *builder, const tarry_node *node, tarry_dimension due,
                             const char *what, tarry_expression *out, tarry_error *error);

/* A number used before any step holds for the whole run (see tarry_builder_constant). */
int tarry_builder_constant_value(tarry_builder *builder, const tarry_node *node,
                                 tarry_dimension due, const char *what, double *value,
                                 tarry_error *error);

/* A rate per unit of time. *formula: it reads species; *index is then one of formulas, else of
 * rates. `half_life`: the scalar is a half-life (and may not read species). */
int tarry_builder_rate(tarry_builder *builder, const tarry_node *node, bool half_life,
                       const char *what, bool *formula, uint32_t *index, tarry_error *error);

/* A whole propensity: always one of formulas. */
int tarry_builder_formula(tarry_builder *builder, const tarry_node *node, const char *what,
                          uint32_t *index, tarry_error *error);

/* The mean of a random amount, at least `least`. */
int tarry_builder_mean(tarry_builder *builder, const tarry_node *node, double least,
                       const char *what, uint32_t *index, tarry_error *error);

/* A delay, by name or in place: an index into delays. */
int tarry_builder_delay_index(tarry_builder *builder, const tarry_node *node, uint32_t *index,
                              tarry_error *error);

/* Turn n weights with a positive sum into cumulative shares, the last exactly 1. */
void tarry_cumulate(double *weights, size_t n);

/* ---- effects -------------------------------------------------------------------------------- */

/* Appending to a draft; 0 or TARRY_MEMORY. A loss is a change of negative amount. */
int tarry_draft_change(tarry_draft *draft, uint32_t species, int64_t amount, tarry_error *error);
int tarry_draft_demand(tarry_draft *draft, uint32_t species, uint32_t amount, tarry_error *error);
int tarry_draft_mark(tarry_draft *draft, uint32_t track, tarry_mark_kind kind, tarry_error *error);
int tarry_draft_schedule(tarry_draft *draft, uint32_t lag, tarry_error *error);
void tarry_draft_release(tarry_draft *draft);

/* Put a draft into order (net changes ascending) and keep it as a new effect. */
int tarry_builder_effect(tarry_builder *builder, tarry_draft *draft, uint32_t *index,
                         tarry_error *error);

/* Make molecules: a change, and where they have a lag of their own (stages, products with a
 * lifetime) that lag once for each. */
int tarry_draft_make(tarry_draft *draft, const tarry_builder *builder, uint32_t species,
                     uint32_t amount, tarry_error *error);

/* Append a lag whose outcomes are still to come. It gets the name of its delay. */
int tarry_builder_lag(tarry_builder *builder, tarry_lag lag, uint32_t *index, tarry_error *error);

/* Give a lag its one outcome, which happens with probability `chance`. */
int tarry_builder_outcome(tarry_builder *builder, uint32_t lag, double chance, uint32_t effect,
                          tarry_error *error);

/* Append a reaction with the factors given (ascending, each species once). `formula`: its rate is
 * one of formulas. The kind follows from both unless `reaction.kind` is PROPENSITY. */
int tarry_builder_reaction(tarry_builder *builder, tarry_reaction reaction, bool formula,
                           const tarry_factor *factors, size_t n_factors, tarry_error *error);

/* ---- readers -------------------------------------------------------------------------------- */

int tarry_read_parameters(tarry_builder *builder, tarry_error *error);
int tarry_read_delays(tarry_builder *builder, tarry_error *error);
int tarry_declare_genes(tarry_builder *builder, tarry_error *error);
int tarry_declare_species(tarry_builder *builder, tarry_error *error);
int tarry_read_genes(tarry_builder *builder, tarry_error *error);
int tarry_read_reactions(tarry_builder *builder, tarry_error *error);
int tarry_read_bursts(tarry_builder *builder, tarry_error *error);
int tarry_read_signals(tarry_builder *builder, tarry_error *error);
int tarry_read_protocol(tarry_builder *builder, tarry_error *error);
int tarry_read_run(tarry_builder *builder, tarry_error *error);
/* Steps that begin a response, and marks on the effects that may be the first after one; by
 * tarry_finish. */
int tarry_mark_firsts(tarry_builder *builder, tarry_error *error);
int tarry_finish(tarry_builder *builder, tarry_error *error);
int tarry_settle(tarry_builder *builder, tarry_error *error);

#endif
