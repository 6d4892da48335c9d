/* SPDX-License-Identifier: GPL-3.0-or-later */

/* Means and spreads at frames and snapshots, pooled over windows, and laws at snapshots.
 *
 * Pooled over a window, each frame counts alike: the mean of means, and the mean of E[x^2] less the
 * square of that. */

#include "study/predict.h"

#include "base/error.h"
#include "base/memory.h"
#include "base/table.h"
#include "exact/chain.h"
#include "exact/counts.h"
#include "exact/covariance.h"
#include "exact/moments.h"
#include "tally/bins.h"
#include "tally/channels.h"
#include "tally/quantities.h"

#include <math.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>

/* Counts below this probability are not told. */
static const double least_told = 1e-12;

/* Laws that need more probabilities are left out. */
static size_t most_counts(const tarry_prediction *p) {
    return p->is_quick ? 1024 : TARRY_COUNTS_MOST;
}

/* Frames of a recorded channel, and all snapshots, in the order of time; one that is both stands
 * once. */
typedef struct clock {
    double *times;
    bool *is_frame;
    size_t n;
} clock;

static int make_clock(tarry_prediction *p, bool frames, clock *c, tarry_error *error) {
    const tarry_run_plan *run = &p->network->run;
    const double same = 1e-9 * run->every;
    const uint32_t n_frames = frames ? run->n_frames : 0;
    c->times = tarry_arena_calloc(&p->arena, n_frames + run->n_snapshots, sizeof *c->times);
    c->is_frame = tarry_arena_calloc(&p->arena, n_frames + run->n_snapshots, sizeof *c->is_frame);
    if (c->times == NULL || c->is_frame == NULL)
        return tarry_fail_memory(error, "a prediction");
    for (uint32_t i = 0, j = 0; i < n_frames || j < run->n_snapshots; c->n++) {
        const double at = i + 1 < n_frames ? i * run->every : run->until;
        const double frame = i < n_frames ? at : INFINITY;
        const double snapshot = j < run->n_snapshots ? run->snapshots[j] : INFINITY;
        c->times[c->n] = fmin(frame, snapshot);
        c->is_frame[c->n] = frame <= snapshot + same;
        i += frame <= snapshot + same;
        j += snapshot <= frame + same;
    }
    return 0;
}

/* ---- moments of one channel ------------------------------------------------------------------ */

/* Copies of a promoter that are in one of its states: independent, each with probability p. */
static int state_moments(tarry_prediction *p, const tarry_exact_gene *gene, uint32_t species,
                         const clock *c, tarry_exact_moments *moments, tarry_error *error) {
    const tarry_network *network = p->network;
    const tarry_promoter *promoter = &network->promoters[network->genes[gene->gene].promoters.from];
    double *states = tarry_calloc(gene->n_states, sizeof *states);
    int code = states == NULL ? tarry_fail_memory(error, "a prediction") : 0;
    for (size_t t = 0; code == 0 && t < c->n; t++) {
        double share = 0;
        code = tarry_exact_states(gene, c->times[t], states, error);
        for (size_t i = 0; code == 0 && i < gene->n_states; i++)
            if (network->states[promoter->states.from + gene->state_of[i]].sum == species)
                share += states[i];
        moments[t] = (tarry_exact_moments){gene->n_copies * share,
                                           gene->n_copies * share * (1 - share)};
    }
    free(states);
    return code;
}

/* Add what the channel sees of one gene. A signal may see fewer alleles than there are. */
static int add_view(tarry_prediction *p, const tarry_exact_gene *gene, const tarry_exact_view *view,
                    const clock *c, tarry_exact_moments *sum, tarry_error *error) {
    tarry_exact_carried carried = {0};
    tarry_exact_moments *part = tarry_calloc(c->n, sizeof *part);
    const double seen = view->n_copies / gene->n_copies;
    int code = part == NULL ? tarry_fail_memory(error, "a prediction")
                            : tarry_exact_carry_view(gene, view, p->horizon, &carried, error);
    if (code == 0)
        code = tarry_exact_moments_at(gene, &carried, c->times, c->n, part, error);
    for (size_t t = 0; code == 0 && t < c->n; t++) {
        sum[t].mean += seen * part[t].mean;
        sum[t].variance += seen * part[t].variance;
    }
    tarry_exact_carried_release(&carried);
    free(part);
    return code;
}

/* Background, and read-out noise with its part that goes with the signal (docs/statistics.md). */
static void add_instrument(const tarry_signal *signal, tarry_exact_moments *m) {
    m->mean += signal->background;
    m->variance += signal->noise * signal->noise +
                   signal->share * signal->share * (m->variance + m->mean * m->mean);
}

static bool is_state(const tarry_network *network, const tarry_channel *channel) {
    return channel->species != TARRY_NONE &&
           network->species[channel->species].role == TARRY_SPECIES_STATE;
}

/* In one of the cells that stand for all. */
static int cell_moments(tarry_prediction *p, const tarry_predict_cell *cell,
                        const tarry_channel *channel, const tarry_exact_view *views, const clock *c,
                        tarry_exact_moments *moments, tarry_error *error) {
    const tarry_network *network = p->network;
    if (is_state(network, channel))
        return state_moments(p, &cell->genes[network->species[channel->species].gene],
                             (uint32_t)channel->species, c, moments, error);
    int code = 0;
    memset(moments, 0, c->n * sizeof *moments);
    for (uint32_t g = 0; code == 0 && g < network->n_genes; g++)
        if (tarry_exact_view_sees(&views[g]))
            code = add_view(p, &cell->genes[g], &views[g], c, moments, error);
    return code;
}

/* Over all cells: the mean of the variances and the variance of the means. */
static int mix_moments(tarry_prediction *p, const tarry_channel *channel,
                       const tarry_exact_view *views, const clock *c, tarry_exact_moments *moments,
                       tarry_error *error) {
    tarry_exact_moments *own = tarry_calloc(c->n, sizeof *own);
    if (own == NULL)
        return tarry_fail_memory(error, "a prediction");
    int code = 0;
    for (size_t k = 0; code == 0 && k < p->n_cells; k++) {
        double before = 0;
        for (size_t i = 0; i < k; i++)
            before += p->cells[i].weight;
        const double weight = p->cells[k].weight / (before + p->cells[k].weight);
        code = cell_moments(p, &p->cells[k], channel, views, c, own, error);
        for (size_t t = 0; code == 0 && t < c->n; t++) {
            const double off = own[t].mean - moments[t].mean;
            moments[t].mean += weight * off;
            moments[t].variance += weight * (own[t].variance - moments[t].variance) +
                                   weight * (1 - weight) * off * off;
        }
    }
    free(own);
    return code;
}

/* *why: NULL, or why the channel is left out. */
static int channel_moments(tarry_prediction *p, const tarry_channel *channel, const clock *c,
                           tarry_exact_moments *moments, const char **why, tarry_error *error) {
    const tarry_network *network = p->network;
    tarry_exact_view *views = NULL;
    int code = 0;
    if (is_state(network, channel))
        *why = p->genes[network->species[channel->species].gene].why;
    else
        code = tarry_predict_views(p, channel, &views, why, error);
    if (code == 0 && *why == NULL)
        code = mix_moments(p, channel, views, c, moments, error);
    for (size_t t = 0; code == 0 && *why == NULL && channel->signal != TARRY_NONE && t < c->n; t++)
        add_instrument(&network->signals[channel->signal], &moments[t]);
    return code;
}

/* ---- tables of moments ----------------------------------------------------------------------- */

static int tell_means(tarry_prediction *p, const tarry_channel *channel, const clock *c,
                      const tarry_exact_moments *moments, tarry_error *error) {
    tarry_table *table = p->results->tables[TARRY_TABLE_means];
    int code = 0;
    for (size_t t = 0; code == 0 && t < c->n; t++) {
        double figures[TARRY_N_MOMENTS];
        tarry_moments_of(moments[t].mean, moments[t].variance, figures);
        if (channel->species == TARRY_NONE)
            figures[TARRY_FANO] = NAN;
        code = tarry_table_add(table, error, channel->name, c->times[t], figures[TARRY_MEAN],
                               figures[TARRY_SD], NAN, NAN, figures[TARRY_FANO], NAN,
                               figures[TARRY_CV2], NAN);
    }
    return code;
}

static bool pool(const clock *c, const tarry_exact_moments *moments, const tarry_window *window,
                 double every, double figures[TARRY_N_MOMENTS]) {
    double n = 0, first = 0, second = 0;
    for (size_t t = 0; t < c->n; t++) {
        const double frame = floor(c->times[t] / every + 0.5);
        if (!c->is_frame[t] || frame < window->frames.from || frame >= window->frames.to)
            continue;
        n++;
        first += moments[t].mean;
        second += moments[t].variance + moments[t].mean * moments[t].mean;
    }
    if (n > 0)
        tarry_moments_of(first / n, second / n - first / n * (first / n), figures);
    return n > 0;
}

/* Products stand in bursts.csv, signals in signals.csv. */
static int tell_pooled(tarry_prediction *p, const tarry_channel *channel, const clock *c,
                       const tarry_exact_moments *moments, tarry_error *error) {
    const tarry_network *network = p->network;
    const bool signal = channel->signal != TARRY_NONE;
    if (!signal && !tarry_channel_is_product(network, channel))
        return 0;
    const char *name = signal ? channel->name
                              : network->genes[network->species[channel->species].gene].name;
    const tarry_moment_row *rows = signal ? tarry_signal_rows : tarry_product_rows;
    tarry_table *table = p->results->tables[signal ? TARRY_TABLE_signals : TARRY_TABLE_bursts];
    int code = 0;
    for (uint32_t w = 0; code == 0 && w < network->run.n_windows; w++) {
        double figures[TARRY_N_MOMENTS];
        if (!pool(c, moments, &network->run.windows[w], network->run.every, figures))
            continue;
        for (int i = 0; code == 0 && i < TARRY_MOMENT_ROWS; i++) {
            char quantity[256];
            snprintf(quantity, sizeof quantity, "%.240s_%s",
                     signal ? "signal" : tarry_product_name(channel->name, name), rows[i].ending);
            code = tarry_table_add(table, error, name, network->run.windows[w].name, quantity,
                                   rows[i].unit, figures[rows[i].moment], NAN, NAN, NAN);
        }
    }
    return code;
}

/* ---- laws ------------------------------------------------------------------------------------ */

/* Probabilities in the bins that a run would use. */
static int tell_law(tarry_prediction *p, const char *name, const char *window, double time,
                    const tarry_exact_counts *counts, tarry_error *error) {
    tarry_table *table = p->results->tables[TARRY_TABLE_distribution];
    int code = 0;
    for (size_t n = 0; code == 0 && n < counts->n;) {
        const uint32_t bin = tarry_bin_of((double)n);
        const double start = tarry_bin_start(bin), width = tarry_bin_width(bin);
        double sum = 0;
        for (; n < counts->n && (double)n < start + width; n++)
            sum += counts->p[n];
        if (sum >= least_told)
            code = tarry_table_add(table, error, name, window, time, start, width, sum, NAN, NAN);
    }
    return code;
}

/* The chain is in one law, and as long ago as a molecule is remembered it was too. */
static int is_steady(const tarry_exact_gene *gene, const tarry_exact_carried *carried, double from,
                     double to, bool *steady, tarry_error *error) {
    const double begin = from - tarry_exact_memory(&carried->mean);
    double *p = tarry_calloc(2 * gene->n_states, sizeof *p);
    *steady = begin >= gene->regimes[0].from &&
              tarry_exact_regime_before(gene, to) == tarry_exact_regime_before(gene, begin);
    int code = p == NULL ? tarry_fail_memory(error, "a prediction") : 0;
    if (code == 0 && *steady)
        code = tarry_exact_states(gene, begin, p, error);
    if (code == 0 && *steady)
        code = tarry_exact_states(gene, to, p + gene->n_states, error);
    for (size_t i = 0; code == 0 && i < gene->n_states; i++)
        *steady = *steady && fabs(p[i] - p[gene->n_states + i]) < 1e-9;
    free(p);
    return code;
}

/* One that is too wide was not worked out. */
static int tell_too_wide(tarry_prediction *p, const char *name, bool is_too_wide,
                         tarry_error *error) {
    char why[128];
    snprintf(why, sizeof why, "it takes more than %zu probabilities", most_counts(p));
    return is_too_wide ? tarry_predict_leave_out(p, name, "its distribution", why, error) : 0;
}

/* What transcripts carry of a species: themselves in a stage, or proteins in one. */
static int carry(const tarry_prediction *p, const tarry_exact_gene *gene, uint32_t species,
                 tarry_exact_carried *carried, tarry_error *error) {
    for (size_t i = 0; i < gene->transcript.n; i++)
        if (gene->transcript.stages[i].species == species)
            return tarry_exact_carry_stage(&gene->transcript, i, p->horizon, carried, error);
    size_t stage = 0;
    while (gene->protein.stages[stage].species != species)
        stage++;
    return tarry_exact_carry_protein(gene, stage, p->horizon, carried, error);
}

/* The law over all cells at some times, or in a window; `counts` zeroed. *steady: it stays so. */
typedef struct mixture {
    const double *times;
    size_t n_times;
    tarry_exact_counts *counts; /* [n_times] */
    bool is_too_wide, is_steady;
} mixture;

static int add_law(tarry_exact_counts *sum, const tarry_exact_counts *part, double weight,
                   tarry_error *error) {
    if (part->n > sum->n) {
        double *more = tarry_calloc(part->n, sizeof *more);
        if (more == NULL)
            return tarry_fail_memory(error, "a prediction");
        for (size_t n = 0; n < sum->n; n++)
            more[n] = sum->p[n];
        free(sum->p);
        *sum = (tarry_exact_counts){more, part->n};
    }
    for (size_t n = 0; n < part->n; n++)
        sum->p[n] += weight * part->p[n];
    return 0;
}

/* Add one cell's laws. Where `to` is above the time the law must stay until then. */
static int add_cell_laws(tarry_prediction *p, const tarry_predict_cell *cell,
                         const tarry_channel *channel, double to, mixture *m, tarry_error *error) {
    const tarry_exact_gene *gene = &cell->genes[p->network->species[channel->species].gene];
    tarry_exact_carried carried = {0};
    tarry_exact_counts *own = tarry_calloc(m->n_times, sizeof *own);
    int code = own == NULL ? tarry_fail_memory(error, "a prediction")
                           : carry(p, gene, (uint32_t)channel->species, &carried, error);
    if (code == 0 && to > m->times[0])
        code = is_steady(gene, &carried, m->times[0], to, &m->is_steady, error);
    if (code == 0 && m->is_steady)
        code = tarry_exact_counts_at(gene, &carried, m->times, m->n_times, most_counts(p), own,
                                     error);
    for (size_t t = 0; code == 0 && m->is_steady && t < m->n_times; t++) {
        m->is_too_wide = m->is_too_wide || own[t].n == 0;
        code = add_law(&m->counts[t], &own[t], cell->weight, error);
    }
    for (size_t t = 0; own != NULL && t < m->n_times; t++)
        tarry_exact_counts_release(&own[t]);
    free(own);
    tarry_exact_carried_release(&carried);
    return code;
}

static int mix_laws(tarry_prediction *p, const tarry_channel *channel, double to, mixture *m,
                    tarry_error *error) {
    int code = 0;
    m->is_steady = true;
    for (size_t k = 0; code == 0 && k < p->n_cells && m->is_steady && !m->is_too_wide; k++)
        code = add_cell_laws(p, &p->cells[k], channel, to, m, error);
    return code;
}

/* In a window in which the law stays it is that of any frame. */
static int tell_window(tarry_prediction *p, const tarry_channel *channel,
                       const tarry_window *window, bool *is_too_wide, tarry_error *error) {
    tarry_exact_counts counts = {0};
    mixture m = {.times = &window->from, .n_times = 1, .counts = &counts};
    int code = mix_laws(p, channel, window->to, &m, error);
    if (code == 0 && !m.is_steady)
        code = tarry_predict_leave_out(p, channel->name, "its distribution pooled over windows",
                                       "its law changes with time", error);
    else if (code == 0 && !m.is_too_wide)
        code = tell_law(p, channel->name, window->name, NAN, &counts, error);
    *is_too_wide = *is_too_wide || m.is_too_wide;
    tarry_exact_counts_release(&counts);
    return code;
}

static int tell_laws(tarry_prediction *p, const tarry_channel *channel, tarry_error *error) {
    const tarry_run_plan *run = &p->network->run;
    mixture m = {.times = run->snapshots,
                 .n_times = run->n_snapshots,
                 .counts = tarry_calloc(run->n_snapshots, sizeof *m.counts)};
    int code = m.counts == NULL ? tarry_fail_memory(error, "a prediction") : 0;
    if (code == 0 && run->n_snapshots > 0)
        code = mix_laws(p, channel, -INFINITY, &m, error);
    for (uint32_t s = 0; code == 0 && (p->n_cells == 1 || !m.is_too_wide) && s < run->n_snapshots;
         s++)
        code = tell_law(p, channel->name, NULL, run->snapshots[s], &m.counts[s], error);
    for (uint32_t w = 0; code == 0 && w < run->n_windows; w++)
        code = tell_window(p, channel, &run->windows[w], &m.is_too_wide, error);
    if (code == 0)
        code = tell_too_wide(p, channel->name, m.is_too_wide, error);
    for (uint32_t s = 0; m.counts != NULL && s < run->n_snapshots; s++)
        tarry_exact_counts_release(&m.counts[s]);
    free(m.counts);
    return code;
}

/* ---- all channels ---------------------------------------------------------------------------- */

static bool is_on_the_way(const tarry_network *network, const tarry_exact_gene *genes,
                          const tarry_channel *channel) {
    if (channel->species == TARRY_NONE || network->species[channel->species].gene == TARRY_NONE)
        return false;
    const tarry_exact_gene *gene = &genes[network->species[channel->species].gene];
    const tarry_exact_chain *const chains[] = {&gene->transcript, &gene->protein};
    for (size_t k = 0; k < 2; k++)
        for (size_t i = 0; i < chains[k]->n; i++)
            if (chains[k]->stages[i].species == (uint32_t)channel->species)
                return true;
    return false;
}

static int predict_channel(tarry_prediction *p, const tarry_channel *channel, tarry_error *error) {
    clock c = {0};
    const char *why = NULL;
    int code = make_clock(p, channel->recorded, &c, error);
    tarry_exact_moments *moments = tarry_calloc(c.n, sizeof *moments);
    if (code == 0 && moments == NULL)
        code = tarry_fail_memory(error, "a prediction");
    if (code == 0)
        code = channel_moments(p, channel, &c, moments, &why, error);
    if (code == 0 && why != NULL)
        code = tarry_predict_leave_out(p, channel->name, "", why, error);
    if (code == 0 && why == NULL)
        code = tell_means(p, channel, &c, moments, error);
    if (code == 0 && why == NULL && channel->recorded)
        code = tell_pooled(p, channel, &c, moments, error);
    if (code == 0 && why == NULL && channel->recorded &&
        is_on_the_way(p->network, p->genes, channel))
        code = tell_laws(p, channel, error);
    free(moments);
    return code != 0 && error != NULL ? tarry_error_context(error, "%s", channel->name) : code;
}

int tarry_predict_counts(tarry_prediction *p, tarry_error *error) {
    int code = 0;
    for (uint32_t i = 0; code == 0 && i < p->network->n_channels; i++) {
        const tarry_channel *channel = &p->network->channels[i];
        const int32_t gene = channel->species == TARRY_NONE
                                 ? TARRY_NONE
                                 : p->network->species[channel->species].gene;
        if (gene == TARRY_NONE || p->genes[gene].why == NULL) /* else it was told with the gene */
            code = predict_channel(p, channel, error);
    }
    return code;
}
