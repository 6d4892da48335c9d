/* SPDX-License-Identifier: GPL-3.0-or-later */

#ifndef TARRY_MODEL_NETWORK_H
#define TARRY_MODEL_NETWORK_H

/* The flat reaction network: what a checked model comes down to. Indices and arrays only, built
 * once in one arena, const and shared by threads from then on. The engine, the tallies, the
 * predictions and `check` all read this and nothing of the text.
 *
 * Times are in the model's unit on the recorded clock: 0 is the start of recording, the settling
 * runs from -settle to 0. Ranges are half open, [from, to). */

#include <stdbool.h>
#include <stdint.h>
#include "base/memory.h"
#include "base/notes.h"
#include "model/expression.h"
#include "model/law.h"

typedef struct tarry_range {
    uint32_t from, to;
} tarry_range;

enum { TARRY_NONE = -1 };

/* ---- species ------------------------------------------------------------------------------- */

typedef enum tarry_species_role {
    TARRY_SPECIES_PLAIN,   /* declared under `species:` */
    TARRY_SPECIES_STATE,   /* a promoter state, summed over alleles: "vela.open" */
    TARRY_SPECIES_ALLELE,  /* one allele's 0 or 1, of a state where copies > 1 or of being
                              ready to initiate; hidden from output */
    TARRY_SPECIES_STAGE,   /* "vela.nascent" */
    TARRY_SPECIES_PRODUCT, /* "vela.transcript", "vela.protein" */
} tarry_species_role;

typedef struct tarry_species {
    const char *name;
    tarry_species_role role;
    int32_t gene; /* or TARRY_NONE */
    double start; /* count at -settle; promoter states are added when the start is drawn */
    tarry_place place;
} tarry_species;

/* ---- what happens at one moment ------------------------------------------------------------- */

typedef struct tarry_change {
    uint32_t species;
    int32_t amount; /* never 0 */
} tarry_change;

/* Molecules that must be there for an effect to happen (used at completion). */
typedef struct tarry_demand {
    uint32_t species;
    uint32_t amount;
} tarry_demand;

typedef enum tarry_amount_kind {
    TARRY_AMOUNT_GEOMETRIC, /* from `least` (0 or 1); parameter: mean */
    TARRY_AMOUNT_POISSON,   /* parameter: mean */
    TARRY_AMOUNT_TABLE,     /* values with shares */
} tarry_amount_kind;

/* A random number of molecules made. `values`/`shares` belong to TABLE. */
typedef struct tarry_amount {
    uint32_t species;
    tarry_amount_kind kind;
    uint32_t least;
    uint32_t mean; /* index into a segment's `means` */
    uint32_t n;
    const double *values;     /* ascending whole numbers >= 0 */
    const double *cumulative; /* cumulative[n-1] is 1 */
} tarry_amount;

typedef enum tarry_mark_kind {
    TARRY_MARK_OPEN,
    TARRY_MARK_CLOSE,
    TARRY_MARK_COUNT,
    TARRY_MARK_FIRST
} tarry_mark_kind;

typedef struct tarry_mark_rule {
    uint32_t track;       /* for FIRST an index into network->firsts */
    tarry_mark_kind kind; /* COUNT adds 1 to the track's hidden counter; FIRST notes the time if it
                             is the first since the step */
} tarry_mark_rule;

/* Everything that happens at one moment: at an initiation or at a completion. Order: demands are
 * looked at, changes made, random amounts drawn (in order), marks made (COUNT before OPEN and
 * CLOSE, FIRST last), lags scheduled (in order, each drawing its length). */
typedef struct tarry_effect {
    tarry_range demands;   /* network->demands; already contained in `changes` as losses */
    tarry_range changes;   /* network->changes: net, each species once, ascending */
    tarry_range amounts;   /* network->amounts */
    tarry_range marks;     /* network->marks */
    tarry_range schedules; /* network->schedules: indices of lags */
    tarry_range affected;  /* network->affected: reactions whose propensity may have changed,
                              ascending, each once (over changes and random amounts) */
    bool skip_short;       /* where a demand is not met: skip the whole effect (true) or stop */
} tarry_effect;

/* ---- lags ------------------------------------------------------------------------------------ */

/* One way in which a lag may end. */
typedef struct tarry_outcome {
    double cumulative; /* probability of this outcome or an earlier one of the same lag */
    uint32_t effect;
} tarry_outcome;

/* A waiting time with what happens when it is over; one for each place in the expanded model where
 * a delay is asked for, in the model's order, which is also the order of completions at equal
 * times. With one outcome of cumulative 1 no number is drawn; where the last cumulative is below 1
 * the rest of the time nothing happens (`chance`). */
typedef struct tarry_lag {
    const char *name;       /* of the stage, the state or "reaction.later": for transit.csv */
    const char *delay_name; /* as named in the model, or the law's word when written in place */
    uint32_t delay;         /* index into a segment's `laws` */
    tarry_range outcomes;   /* network->outcomes */
    tarry_range ramps;      /* network->lag_ramps: signals that see the molecules under way */
    int32_t stage;          /* the species that holds the molecules under way, or TARRY_NONE */
    int32_t promoter;       /* the promoter whose state lasts this long, or TARRY_NONE */
    int32_t gene;           /* or TARRY_NONE */
    bool may_be_lost;       /* its molecule may leave before the end: */
    uint32_t loss_rate;     /* index into a segment's `rates` */
    uint32_t loss_effect;   /* what happens then */
    bool in_order;          /* none is over before the one that began before it, */
    double headway;         /* but this much later at least */
    uint32_t allele;        /* whose lag it is, where each has one; else 0 */
    tarry_place place;
} tarry_lag;

/* ---- reactions --------------------------------------------------------------------------------
 */

typedef enum tarry_rate_kind {
    TARRY_RATE_CONSTANT,   /* rate */
    TARRY_RATE_LINEAR,     /* rate * count of `species` */
    TARRY_RATE_WAYS,       /* rate * product over factors of C(x, used) C(x - used, needed) */
    TARRY_RATE_EXPRESSION, /* expression(counts) * ways of the factors */
    TARRY_RATE_PROPENSITY, /* expression(counts) as a whole; 0 where a factor is lacking */
} tarry_rate_kind;

typedef struct tarry_factor {
    uint32_t species;
    uint32_t used;
    uint32_t needed;
} tarry_factor;

typedef struct tarry_reaction {
    const char *name; /* "vela.shut>open", "vela.initiation", "vela.transcript decay", "bind" */
    tarry_rate_kind kind;
    uint32_t species;    /* for LINEAR */
    tarry_range factors; /* network->factors, ascending by species; empty for CONSTANT */
    uint32_t rate; /* index into a segment's `rates`; for the last two kinds into `formulas` */
    uint32_t effect;
    int32_t gene;   /* or TARRY_NONE */
    int32_t allele; /* or TARRY_NONE */
    tarry_place place;
} tarry_reaction;

/* ---- promoters, one for each allele of each gene ------------------------------------------------
 */

typedef struct tarry_promoter_state {
    const char *name; /* "open" */
    uint32_t species; /* this allele's 0 or 1 */
    uint32_t sum;     /* the sum over alleles; equals `species` where copies is 1 */
    int32_t lag;      /* lag that this state lasts, or TARRY_NONE */
    bool active;      /* bursts are counted in it */
} tarry_promoter_state;

typedef struct tarry_promoter {
    uint32_t gene;
    uint32_t allele;
    tarry_range states; /* network->states */
    uint32_t track;
    const double *start; /* cumulative start weights over its states, last is 1 */
    bool steady;         /* started in the stationary law: a lasting state's dwell is under way */
} tarry_promoter;

/* ---- tracks: what bursts are counted on ---------------------------------------------------------
 */

typedef struct tarry_track {
    const char *name; /* the gene's, or the name under `bursts:` */
    int32_t gene;     /* or TARRY_NONE for a named one */
    uint32_t allele;
    bool tells; /* false: bursts cannot be told (always active); counts are kept all the same */
} tarry_track;

/* Tracks pooled under one name: a gene's alleles, or one named track. */
typedef struct tarry_gene {
    const char *name;
    tarry_range promoters; /* empty for a named track */
    tarry_range tracks;
    tarry_range products; /* network->products: species of stages, transcript, protein, in order */
    uint32_t n_copies;
    bool tells;
    tarry_place place;
} tarry_gene;

/* ---- signals ------------------------------------------------------------------------------------
 */

typedef struct tarry_weight {
    uint32_t species;
    double weight; /* brightness included */
} tarry_weight;

/* A molecule that has spent fraction f of its lag shines brightness * clip((f - from)/(to - from),
 * 0, 1); from = to is a step from f = from on. */
typedef struct tarry_ramp {
    uint32_t signal;
    uint32_t lag;
    double from, to, brightness;
} tarry_ramp;

typedef struct tarry_signal {
    const char *name;
    tarry_range weights; /* network->weights */
    tarry_range ramps;   /* network->signal_ramps: indices into network->ramps */
    double background;
    double noise; /* sd of the read-out noise in one frame: its fixed part, */
    double share; /* and the part that goes with the noiseless signal, as a share of that */
    double responds_above; /* the level whose first crossing after a step is told, or NaN */
    double detects_above;  /* where it is not above this it is not found, and missing (NaN): */
    bool from_first;       /* only before the first frame that is above. NaN: all is there */
    tarry_place place;
} tarry_signal;

/* ---- the protocol
 * -------------------------------------------------------------------------------- */

typedef struct tarry_setting {
    int32_t species;   /* species set to `value`, or TARRY_NONE: */
    uint32_t promoter; /* this promoter is moved to its state number `state`, a new dwell begins */
    uint32_t state;
    double value;
    tarry_place place;
} tarry_setting;

/* What begins with a segment, of several the first in this list. */
typedef enum tarry_moment {
    TARRY_MOMENT_STEP,      /* a step, or a ramp begins */
    TARRY_MOMENT_RAMP_END,  /* a ramp has come to its last value */
    TARRY_MOMENT_RAMP_PART, /* the next stretch of a ramp under way: no step of its own */
} tarry_moment;

/* What is in force from `start` to the next segment's start. Segment 0 starts at -settle. */
typedef struct tarry_segment {
    double start;
    tarry_moment moment;
    int32_t response;                 /* that it begins, or TARRY_NONE */
    const double *parameters;         /* n_parameters; where some vary, of a cell in the middle */
    const bool *is_set;               /* n_parameters: given by this step or an earlier one; NULL:
                                         none */
    const double *rates;              /* n_rates, per unit of time */
    const double *means;              /* n_means, of random amounts */
    const tarry_expression *formulas; /* n_formulas, parameters folded in: read species only */
    const tarry_law *laws;            /* n_delays */
    tarry_range settings;             /* network->settings, carried out in order at `start` */
    const char *text;                 /* "k_open = 0.4, load = 2", for captions and `check` */
} tarry_segment;

/* ---- first responses: how long after a step something first happens
 * ----------------------- */

/* The stretch after a step, to the next one or to `until`. Parts and ends of ramps are no steps. */
typedef struct tarry_response {
    double from, to; /* from < to */
} tarry_response;

/* What is waited for: an initiation, or a finished transcript or protein. */
typedef struct tarry_first {
    const char *name; /* "vela initiation", "vela.transcript" */
    uint32_t gene;
    int32_t species;    /* or TARRY_NONE: initiations */
    tarry_range before; /* network->products: molecules that may still give rise to it */
} tarry_first;

/* ---- what is recorded
 * ---------------------------------------------------------------------------- */

/* A name in the output: a species that is not hidden, or a signal. */
/* By which a trace is told to be visible or dark (tally/visible.h). */
typedef struct tarry_thresholds {
    double low, high; /* of the signal */
    double least;     /* time that a change must last to count */
    bool is_found;    /* from the background of data, which is: */
    double background, background_sd;
} tarry_thresholds;

typedef struct tarry_channel {
    const char *name;
    int32_t species; /* or TARRY_NONE */
    int32_t signal;  /* or TARRY_NONE */
    bool recorded;   /* gets frames, distributions, autocorrelation; else snapshot moments only */
    bool correlates; /* recorded, and a signal or a product: gets an autocorrelation */
    const tarry_thresholds *thresholds; /* or NULL */
} tarry_channel;

/* A window is a union of spans; spans are the stretches between neighbouring window bounds. */
typedef struct tarry_window {
    const char *name;
    double from, to;
    tarry_range spans;
    tarry_range
        frames; /* frames with from <= time <= to (< to where another window follows there) */
} tarry_window;

typedef struct tarry_run_plan {
    int64_t cells;
    uint64_t seed;
    double settle;     /* >= 0 */
    bool settle_auto;  /* it was worked out from the means */
    double until;      /* > 0 */
    double every;      /* until / (n_frames - 1) */
    uint32_t n_frames; /* at 0, every, ..., until: frame i is at i * every, the last at until */
    uint32_t n_lags;   /* autocorrelation lags 0 .. n_lags - 1, in frames */
    uint32_t n_snapshots;
    const double *snapshots; /* ascending, in [0, until] */
    uint32_t n_windows;
    const tarry_window *windows;
    uint32_t n_spans;
    const double *bounds; /* n_spans + 1 ascending times from 0 to until */
    bool noise_unknown;   /* correlations are over the line put back to lag 0, as those of data */
    double limit_firings; /* a cell, settling and running on included */
    double limit_pending; /* completions under way at once in one cell */
    double limit_memory;  /* bytes, all tallies and cells together */
} tarry_run_plan;

/* ---- laboratory data ----------------------------------------------------------------------------
 *
 * A network may stand for a file of data: names, times and windows, and no species that react. */

/* What is taken off before values are correlated. */
typedef enum tarry_film_mean {
    TARRY_FILM_MEAN_ALL,   /* the mean over cells and frames */
    TARRY_FILM_MEAN_FRAME, /* the mean over cells at each frame */
    TARRY_FILM_MEAN_CELL,  /* each cell's own mean */
} tarry_film_mean;

typedef struct tarry_data_plan {
    const char *kind;      /* "traces", "counts", "means" */
    const char *sha256;    /* of the file */
    const char *resampled; /* "cell", "group", ...: what intervals come from */
    int64_t n_resampled;   /* of these there are so many */
    int64_t n_rows;
    double start;   /* the time of frame 0 */
    double missing; /* share of the frames between a cell's first and last one */
    tarry_film_mean mean;
    uint32_t longest;                 /* frames from the first to the last of a cell, at most */
    const double *shifts;             /* [channel] a value amid its values, */
    const double *ranges;             /* and the largest less the least of them */
    const struct tarry_model *beside; /* whose laws stand beside the data, or NULL */
} tarry_data_plan;

typedef struct tarry_network {
    tarry_arena *arena;
    const char *title;           /* "" where none is given */
    const char *time_unit;       /* "min" */
    const tarry_data_plan *data; /* NULL: a model */
    bool gaps;                   /* values may be NaN: missing in data, or not detected */

    uint32_t n_species;
    const tarry_species *species;
    uint32_t n_reactions;
    const tarry_reaction *reactions;
    uint32_t n_effects;
    const tarry_effect *effects;
    uint32_t n_lags;
    const tarry_lag *lags;

    const tarry_change *changes;
    const tarry_demand *demands;
    const tarry_amount *amounts;
    const tarry_mark_rule *marks;
    const uint32_t *schedules;
    const uint32_t *affected;
    const tarry_outcome *outcomes;
    const tarry_factor *factors;

    uint32_t n_promoters;
    const tarry_promoter *promoters;
    const tarry_promoter_state *states;
    uint32_t n_tracks;
    const tarry_track *tracks;
    uint32_t n_genes; /* genes first, then named bursts */
    const tarry_gene *genes;
    const uint32_t *products;

    uint32_t n_signals;
    const tarry_signal *signals;
    const tarry_weight *weights;
    uint32_t n_ramps;
    const tarry_ramp *ramps;
    const uint32_t *lag_ramps;    /* indices into ramps, by lag (tarry_lag.ramps) */
    const uint32_t *signal_ramps; /* indices into ramps, by signal (tarry_signal.ramps) */

    uint32_t n_parameters;
    const char *const *parameter_names;
    const struct tarry_variation *variation; /* parameters that differ from cell to cell, or NULL */
    uint32_t n_rates, n_means, n_formulas, n_delays;
    uint32_t n_segments;
    const tarry_segment *segments;
    const tarry_setting *settings;

    uint32_t n_responses; /* both are 0 without a protocol */
    const tarry_response *responses;
    uint32_t n_firsts;
    const tarry_first *firsts;

    uint32_t n_channels; /* species in order (without hidden ones), then signals */
    const tarry_channel *channels;

    tarry_run_plan run;

    /* For each species the reactions whose propensity reads it: dependents[dependent_start[s] ..
     * dependent_start[s + 1]), ascending. */
    const uint32_t *dependent_start;
    const uint32_t *dependents;
} tarry_network;

#endif
