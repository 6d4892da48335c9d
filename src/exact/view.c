/* SPDX-License-Identifier: GPL-3.0-or-later */

#include "exact/view.h"

#include "exact/delayed.h"
#include "exact/fold.h"

#include "base/error.h"
#include "base/memory.h"

#include <math.h>
#include <stdlib.h>

/* ---- reading --------------------------------------------------------------------------------- */

static int64_t stage_of(const tarry_exact_chain *chain, uint32_t species) {
    for (size_t i = 0; i < chain->n; i++)
        if (chain->stages[i].species == species)
            return (int64_t)i;
    return TARRY_NONE;
}

static bool has_species(const tarry_network *network, const tarry_exact_gene *gene,
                        uint32_t species) {
    return network->species[species].gene == (int32_t)gene->gene;
}

/* Why a species that is no molecule of the gene's chains cannot be seen. */
static const char *not_on_the_way(const tarry_network *network, uint32_t species) {
    const tarry_species_role role = network->species[species].role;
    return role == TARRY_SPECIES_STATE || role == TARRY_SPECIES_ALLELE
               ? "signals that see promoter states are not covered"
               : "it sees a molecule that does not come from the gene's initiations";
}

/* Take in a species with a weight, or say why not. */
static void take(const tarry_network *network, const tarry_exact_gene *gene, uint32_t species,
                 tarry_exact_glimpse glimpse, tarry_exact_view *view) {
    if (!has_species(network, gene, species))
        return;
    view->looks = true;
    if (view->why != NULL)
        return;
    const int64_t own = stage_of(&gene->transcript, species);
    const int64_t of_protein = stage_of(&gene->protein, species);
    if (own == TARRY_NONE && of_protein == TARRY_NONE) {
        view->why = not_on_the_way(network, species);
        return;
    }
    const tarry_exact_chain *chain = own != TARRY_NONE ? &gene->transcript : &gene->protein;
    tarry_exact_glimpses *glimpses = own != TARRY_NONE ? &view->transcript : &view->protein;
    glimpse.stage = (size_t)(own != TARRY_NONE ? own : of_protein);
    view->why = chain->stages[glimpse.stage].why;
    glimpses->list[glimpses->n++] = glimpse;
}

bool tarry_exact_view_sees(const tarry_exact_view *view) {
    return view->transcript.n + view->protein.n > 0;
}

static bool same_glimpse(const tarry_ramp *one, const tarry_ramp *other,
                         const tarry_network *network) {
    return network->lags[one->lag].stage == network->lags[other->lag].stage &&
           one->from == other->from && one->to == other->to && one->brightness == other->brightness;
}

/* Where each allele has a lag of its own, a signal has a ramp for each allele that it sees: they
 * are one glimpse of so many copies. */
static void take_ramps(const tarry_network *network, const tarry_exact_gene *gene,
                       const tarry_signal *signal, tarry_exact_view *view) {
    for (uint32_t i = signal->ramps.from; i < signal->ramps.to; i++) {
        const tarry_ramp *ramp = &network->ramps[network->signal_ramps[i]];
        const int32_t species = network->lags[ramp->lag].stage;
        bool stands = false;
        double n_seen = 0, n_lags = 0;
        for (uint32_t k = signal->ramps.from; k < signal->ramps.to; k++) {
            const tarry_ramp *like = &network->ramps[network->signal_ramps[k]];
            stands = stands || (k < i && same_glimpse(ramp, like, network));
            n_seen += same_glimpse(ramp, like, network);
        }
        for (uint32_t l = 0; l < network->n_lags; l++)
            n_lags += network->lags[l].stage == species;
        if (stands || species == TARRY_NONE || !has_species(network, gene, (uint32_t)species))
            continue;
        const double copies = n_lags > 1 ? n_seen : gene->n_copies;
        if (tarry_exact_view_sees(view) && copies != view->n_copies)
            view->why = "it sees some stages of one allele and others of all";
        view->n_copies = copies;
        take(network, gene, (uint32_t)species,
             (tarry_exact_glimpse){0, ramp->brightness, ramp->from, ramp->to}, view);
    }
}

int tarry_exact_view_read(const tarry_network *network, const tarry_exact_gene *gene,
                          const tarry_channel *channel, tarry_arena *arena, tarry_exact_view *view,
                          tarry_error *error) {
    *view = (tarry_exact_view){.n_copies = gene->n_copies, .why = gene->why};
    size_t n_most = 1;
    const tarry_signal *signal = NULL;
    if (channel->signal != TARRY_NONE) {
        signal = &network->signals[channel->signal];
        if (!isnan(signal->detects_above))
            view->why = "it tells only what is detected of it (detects)";
        n_most = (signal->weights.to - signal->weights.from) +
                 (signal->ramps.to - signal->ramps.from);
    }
    view->transcript.list = tarry_arena_calloc(arena, n_most, sizeof *view->transcript.list);
    view->protein.list = tarry_arena_calloc(arena, n_most, sizeof *view->protein.list);
    if (view->transcript.list == NULL || view->protein.list == NULL)
        return tarry_fail_memory(error, "what a signal sees");
    if (signal == NULL) {
        take(network, gene, (uint32_t)channel->species, (tarry_exact_glimpse){0, 1, 0, 0}, view);
        return 0;
    }
    for (uint32_t i = signal->weights.from; i < signal->weights.to; i++)
        take(network, gene, network->weights[i].species,
             (tarry_exact_glimpse){0, network->weights[i].weight, 0, 0}, view);
    take_ramps(network, gene, signal, view);
    return 0;
}

/* ---- proteins -------------------------------------------------------------------------------- */

int tarry_exact_translations(const tarry_exact_gene *gene, tarry_exact_glimpses *rates,
                             tarry_error *error) {
    *rates = (tarry_exact_glimpses){tarry_calloc(gene->transcript.n, sizeof *rates->list), 0};
    if (rates->list == NULL)
        return tarry_fail_memory(error, "what a signal sees");
    for (size_t i = 0; i < gene->transcript.n; i++)
        if (gene->transcript.stages[i].translation > 0)
            rates->list[rates->n++] = (tarry_exact_glimpse){
                i, gene->transcript.stages[i].translation, 0, 0};
    return 0;
}

/* Two curves added up in place of the first. */
static int add_curve(tarry_curve *sum, const tarry_curve *part, double factor, double horizon,
                     tarry_error *error) {
    if (part->n == 0)
        return 0;
    tarry_curve before = *sum;
    double scale = 0;
    const tarry_curve_term terms[] = {{&before, 0, 1}, {part, 0, factor}};
    for (size_t i = 0; i < 2; i++)
        for (size_t k = 0; k < terms[i].curve->n; k++)
            scale = fmax(
                scale, fabs(terms[i].factor * terms[i].curve->coefficients[k * TARRY_CURVE_NODES]));
    *sum = (tarry_curve){0};
    const int code = tarry_curve_sum(terms, 2, horizon, TARRY_DELAYED_TOLERANCE * scale, sum,
                                     error);
    tarry_curve_release(&before);
    return code;
}

int tarry_exact_view_mean(const tarry_exact_gene *gene, const tarry_exact_view *view,
                          double horizon, tarry_curve *mean, tarry_error *error) {
    tarry_curve made = {0}, seen = {0}, proteins = {0};
    tarry_exact_glimpses rates = {0};
    int code = tarry_exact_glimpses_mean(&gene->transcript, &view->transcript, horizon, mean,
                                         error);
    if (code == 0 && view->protein.n > 0) {
        code = tarry_exact_translations(gene, &rates, error);
        if (code == 0)
            code = tarry_exact_glimpses_mean(&gene->transcript, &rates, horizon, &made, error);
        if (code == 0)
            code = tarry_exact_glimpses_mean(&gene->protein, &view->protein, horizon, &seen, error);
        if (code == 0)
            code = tarry_fold(&made, &seen, horizon, &proteins, error);
        if (code == 0)
            code = add_curve(mean, &proteins, 1, horizon, error);
    }
    tarry_curve_release(&made);
    tarry_curve_release(&seen);
    tarry_curve_release(&proteins);
    free(rates.list);
    return code;
}

/* ---- overlap --------------------------------------------------------------------------------- */

/* Curves on the way: of the transcript, of its translation, of one protein. */
typedef struct overlap_work {
    const tarry_exact_gene *gene;
    const tarry_exact_view *one, *other;
    double horizon;
    tarry_exact_glimpses rates;
    tarry_curve made;        /* mean translation at an age */
    tarry_curve seen[2];     /* mean contribution of a protein of an age to each view */
    tarry_curve from[2];     /* seen once by the first view and translated later, and the other
                                way round */
    tarry_curve to[2];       /* translated and seen later by the second view, and the other way */
    tarry_curve pairs;       /* translated twice */
    tarry_curve meetings[2]; /* of the two contributions of proteins: second later, first later */
    tarry_curve twice;       /* of one protein */
    tarry_error *error;
} overlap_work;

static void release_work(overlap_work *w) {
    tarry_curve *const curves[] = {&w->made,    &w->seen[0],     &w->seen[1],    &w->from[0],
                                   &w->from[1], &w->to[0],       &w->to[1],      &w->pairs,
                                   &w->twice,   &w->meetings[0], &w->meetings[1]};
    for (size_t i = 0; i < sizeof curves / sizeof *curves; i++)
        tarry_curve_release(curves[i]);
    free(w->rates.list);
}

static int along(overlap_work *w, const tarry_exact_glimpses *one,
                 const tarry_exact_glimpses *other, tarry_curve *out) {
    return tarry_exact_glimpses_overlap(&w->gene->transcript, one, other, w->horizon, out,
                                        w->error);
}

static int find_curves(overlap_work *w) {
    const tarry_exact_chain *protein = &w->gene->protein;
    int code = tarry_exact_translations(w->gene, &w->rates, w->error);
    if (code == 0)
        code = tarry_exact_glimpses_mean(&w->gene->transcript, &w->rates, w->horizon, &w->made,
                                         w->error);
    if (code == 0)
        code = tarry_exact_glimpses_mean(protein, &w->one->protein, w->horizon, &w->seen[0],
                                         w->error);
    if (code == 0)
        code = tarry_exact_glimpses_mean(protein, &w->other->protein, w->horizon, &w->seen[1],
                                         w->error);
    return code;
}

/* The transcript is seen by one view, and its proteins by the other. */
static int add_mixed(overlap_work *w, tarry_curve *sum) {
    static const tarry_curve nothing = {0};
    const tarry_exact_glimpses *one = &w->one->transcript, *other = &w->other->transcript;
    tarry_curve first = {0}, second = {0};
    int code = 0;
    if (one->n > 0 && w->seen[1].n > 0) {
        const tarry_two_sided f = {&w->from[0], &w->from[1]}, g = {&w->seen[1], &nothing};
        code = along(w, one, &w->rates, &w->from[0]);
        if (code == 0)
            code = along(w, &w->rates, one, &w->from[1]);
        if (code == 0)
            code = tarry_fold_both(&f, &g, w->horizon, &first, w->error);
    }
    if (code == 0 && other->n > 0 && w->seen[0].n > 0) {
        const tarry_two_sided f = {&w->to[0], &w->to[1]}, g = {&nothing, &w->seen[0]};
        code = along(w, &w->rates, other, &w->to[0]);
        if (code == 0)
            code = along(w, other, &w->rates, &w->to[1]);
        if (code == 0)
            code = tarry_fold_both(&f, &g, w->horizon, &second, w->error);
    }
    if (code == 0)
        code = add_curve(sum, &first, 1, w->horizon, w->error);
    if (code == 0)
        code = add_curve(sum, &second, 1, w->horizon, w->error);
    tarry_curve_release(&first);
    tarry_curve_release(&second);
    return code;
}

/* Proteins are seen by both views: two proteins of one transcript, or one protein twice. */
static int add_proteins(overlap_work *w, tarry_curve *sum) {
    tarry_curve both = {0};
    const tarry_two_sided f = {&w->pairs, &w->pairs}, g = {&w->meetings[0], &w->meetings[1]};
    if (w->seen[0].n == 0 || w->seen[1].n == 0)
        return 0;
    int code = along(w, &w->rates, &w->rates, &w->pairs);
    if (code == 0)
        code = tarry_fold_along(&w->seen[0], &w->seen[1], w->horizon, &w->meetings[0], w->error);
    if (code == 0)
        code = tarry_fold_along(&w->seen[1], &w->seen[0], w->horizon, &w->meetings[1], w->error);
    if (code == 0)
        code = tarry_fold_both(&f, &g, w->horizon, &both, w->error);
    if (code == 0)
        code = add_curve(sum, &both, 1, w->horizon, w->error);
    if (code == 0)
        code = tarry_exact_glimpses_overlap(&w->gene->protein, &w->one->protein, &w->other->protein,
                                            w->horizon, &w->twice, w->error);
    if (code == 0)
        code = add_curve(sum, &w->twice, tarry_curve_integral(&w->made, INFINITY), w->horizon,
                         w->error);
    tarry_curve_release(&both);
    return code;
}

int tarry_exact_view_overlap(const tarry_exact_gene *gene, const tarry_exact_view *one,
                             const tarry_exact_view *other, double horizon, tarry_curve *overlap,
                             tarry_error *error) {
    overlap_work w = {.gene = gene, .one = one, .other = other, .horizon = horizon, .error = error};
    int code = along(&w, &one->transcript, &other->transcript, overlap);
    if (code == 0 && one->protein.n + other->protein.n > 0) {
        code = find_curves(&w);
        if (code == 0)
            code = add_mixed(&w, overlap);
        if (code == 0)
            code = add_proteins(&w, overlap);
    }
    release_work(&w);
    return code;
}
