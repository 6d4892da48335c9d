/* SPDX-License-Identifier: GPL-3.0-or-later */

/* Autocorrelations of signals and products, cross-correlations of signals, at the lags of a run. */

#include "study/predict.h"

#include "base/error.h"
#include "base/memory.h"
#include "base/table.h"
#include "exact/covariance.h"
#include "tally/channels.h"
#include "tally/correlation.h"
#include "tally/quantities.h"

#include <math.h>
#include <stdio.h>
#include <stdlib.h>

#include <string.h>

/* One channel in one window. */
typedef struct film {
    const tarry_channel *channel;
    const tarry_window *window;
    tarry_exact_view *views; /* [n_genes] */
    double mean;             /* background off */
    double variance;         /* read-out noise off */
    double level;            /* what correlations are over: that, or how data tell it */
} film;

/* Lags of a curve in frames. */
static uint32_t n_lags_of(const tarry_network *network, const tarry_window *window) {
    const uint32_t n_frames = window->frames.to - window->frames.from;
    return n_frames < network->run.n_lags ? n_frames : network->run.n_lags;
}

/* Covariances at lags from `least` on in one of the cells that stand for all, added up over the
 * genes that both see. */
static int cell_covariances(tarry_prediction *p, const tarry_predict_cell *cell, const film *one,
                            const film *other, const tarry_window *window, ptrdiff_t least,
                            size_t n, double mean[2], double *out, const char **why,
                            tarry_error *error) {
    int code = 0;
    mean[0] = mean[1] = 0;
    for (uint32_t g = 0; code == 0 && *why == NULL && g < p->network->n_genes; g++) {
        tarry_exact_covariance c = {0};
        if (!tarry_exact_view_sees(&one->views[g]) || !tarry_exact_view_sees(&other->views[g]))
            continue;
        code = tarry_exact_covariance_init(&cell->genes[g], &one->views[g], &other->views[g],
                                           window->from, window->to, p->horizon, &p->arena, &c, why,
                                           error);
        for (size_t i = 0; code == 0 && *why == NULL && i < n; i++)
            out[i] += tarry_exact_covariance_at(&c, (double)(least + (ptrdiff_t)i) *
                                                        p->network->run.every);
        mean[0] += c.mean[0];
        mean[1] += c.mean[1];
        tarry_exact_covariance_release(&c);
    }
    return code;
}

/* Over all cells: the mean of the covariances and the covariance of the means. */
static int find_covariances(tarry_prediction *p, const film *one, const film *other,
                            const tarry_window *window, ptrdiff_t least, size_t n, double mean[2],
                            double *out, const char **why, tarry_error *error) {
    double *own = tarry_calloc(n, sizeof *own), all = 0, means = 0;
    if (own == NULL)
        return tarry_fail_memory(error, "a prediction");
    int code = 0;
    mean[0] = mean[1] = 0;
    for (size_t k = 0; code == 0 && *why == NULL && k < p->n_cells; k++) {
        double of_cell[2];
        memset(own, 0, n * sizeof *own);
        code = cell_covariances(p, &p->cells[k], one, other, window, least, n, of_cell, own, why,
                                error);
        const double weight = p->cells[k].weight / (all + p->cells[k].weight);
        const double off[2] = {of_cell[0] - mean[0], of_cell[1] - mean[1]};
        all += p->cells[k].weight;
        for (size_t i = 0; i < n; i++)
            out[i] += weight * (own[i] - out[i]);
        means += weight * ((1 - weight) * off[0] * off[1] - means);
        mean[0] += weight * off[0];
        mean[1] += weight * off[1];
    }
    for (size_t i = 0; i < n; i++)
        out[i] += means;
    free(own);
    return code;
}

/* `noise`: of read-out, in what is seen at lag 0 and not in the correlation. */
static int tell_curve(tarry_prediction *p, const char *window, const char *first,
                      const char *second, ptrdiff_t least, size_t n, const double *covariance,
                      double noise, double scale, double squared, tarry_error *error) {
    tarry_table *table = p->results->tables[TARRY_TABLE_autocorrelation];
    const bool is_itself = strcmp(first, second) == 0;
    int code = 0;
    for (size_t i = 0; code == 0 && i < n; i++) {
        const ptrdiff_t lag = least + (ptrdiff_t)i;
        const double seen = covariance[i] + (lag == 0 ? noise : 0);
        code = tarry_table_add(table, error, window, first, second,
                               (double)lag * p->network->run.every, NAN, seen,
                               is_itself && lag == 0 ? 1 : covariance[i] / scale, NAN, NAN,
                               squared != 0 ? seen / squared : NAN, NAN, NAN);
    }
    return code;
}

/* ---- one channel ----------------------------------------------------------------------------- */

static int tell_product(tarry_prediction *p, const film *f, double decay, tarry_error *error) {
    const tarry_network *network = p->network;
    const tarry_gene *gene = &network->genes[network->species[f->channel->species].gene];
    char quantity[256];
    snprintf(quantity, sizeof quantity, "%.240s_decay_time",
             tarry_product_name(f->channel->name, gene->name));
    return tarry_table_add(p->results->tables[TARRY_TABLE_bursts], error, gene->name,
                           f->window->name, quantity, network->time_unit, decay, NAN, NAN, NAN);
}

static int tell_signal(tarry_prediction *p, const film *f, double decay, double plateau,
                       tarry_error *error) {
    tarry_table *table = p->results->tables[TARRY_TABLE_signals];
    const char *name = f->channel->name, *window = f->window->name;
    const double squared = f->mean * f->mean;
    int code = tarry_table_add(table, error, name, window, "decay_time", p->network->time_unit,
                               decay, NAN, NAN, NAN);
    if (code == 0)
        code = tarry_table_add(table, error, name, window, "plateau", "1", plateau, NAN, NAN, NAN);
    if (code == 0)
        code = tarry_table_add(table, error, name, window, "amplitude", "1",
                               squared > 0 ? f->level / squared : NAN, NAN, NAN, NAN);
    return code;
}

/* Noise is in the covariance at lag 0, and not in the correlation (docs/statistics.md). */
static double noise_of(const tarry_network *network, const film *f) {
    if (f->channel->signal == TARRY_NONE)
        return 0;
    const tarry_signal *s = &network->signals[f->channel->signal];
    const double level = f->mean + s->background;
    return s->noise * s->noise + s->share * s->share * (f->variance + level * level);
}

static int tell_film(tarry_prediction *p, film *f, double *covariance, size_t n,
                     tarry_error *error) {
    const double every = p->network->run.every;
    double *correlation = tarry_calloc(n, sizeof *correlation);
    if (correlation == NULL)
        return tarry_fail_memory(error, "a prediction");
    for (size_t i = 0; i < n; i++)
        correlation[i] = covariance[i] / f->level;
    const double plateau = tarry_correlation_plateau(correlation, n);
    const double decay = tarry_correlation_decay(correlation, n, plateau) * every;
    free(correlation);
    int code = tell_curve(p, f->window->name, f->channel->name, f->channel->name, 0, n, covariance,
                          noise_of(p->network, f), f->level, f->mean * f->mean, error);
    if (code != 0)
        return code;
    return f->channel->signal != TARRY_NONE ? tell_signal(p, f, decay, plateau, error)
                                            : tell_product(p, f, decay, error);
}

static double level_of(const tarry_network *network, const tarry_channel *channel,
                       const double *covariance, size_t n) {
    return network->run.noise_unknown && tarry_channel_is_real(channel) && n >= TARRY_LAGS_PUT_BACK
               ? tarry_put_back(covariance)
               : covariance[0];
}

static int predict_film(tarry_prediction *p, film *f, const char **why, tarry_error *error) {
    const size_t n = n_lags_of(p->network, f->window);
    double mean[2];
    double *covariance = tarry_calloc(n, sizeof *covariance);
    int code = covariance == NULL
                   ? tarry_fail_memory(error, "a prediction")
                   : find_covariances(p, f, f, f->window, 0, n, mean, covariance, why, error);
    if (code == 0 && *why == NULL) {
        f->mean = mean[0];
        f->variance = covariance[0];
        f->level = level_of(p->network, f->channel, covariance, n);
        if (!(f->variance > 0 && f->level > 0))
            *why = "it does not vary";
        else
            code = tell_film(p, f, covariance, n, error);
    }
    free(covariance);
    return code;
}

/* ---- pairs ----------------------------------------------------------------------------------- */

static int predict_pair(tarry_prediction *p, const film *one, const film *other,
                        tarry_error *error) {
    const size_t n = 2 * (size_t)n_lags_of(p->network, one->window) - 1;
    const ptrdiff_t least = -(ptrdiff_t)(n / 2);
    const char *why = NULL;
    double mean[2];
    double *covariance = tarry_calloc(n, sizeof *covariance);
    int code = covariance == NULL ? tarry_fail_memory(error, "a prediction")
                                  : find_covariances(p, one, other, one->window, least, n, mean,
                                                     covariance, &why, error);
    if (code == 0 && why != NULL)
        code = tarry_predict_leave_out(p, one->channel->name, other->channel->name, why, error);
    else if (code == 0)
        code = tell_curve(p, one->window->name, one->channel->name, other->channel->name, least, n,
                          covariance, 0, sqrt(one->level * other->level), one->mean * other->mean,
                          error);
    free(covariance);
    return code;
}

/* ---- windows --------------------------------------------------------------------------------- */

/* The films of all channels that correlate; those that cannot be worked out have no variance. */
static int predict_window(tarry_prediction *p, const tarry_window *window, film *films,
                          tarry_error *error) {
    const tarry_network *network = p->network;
    size_t n = 0;
    int code = 0;
    for (uint32_t i = 0; code == 0 && i < network->n_channels; i++) {
        const char *why = NULL;
        const tarry_channel *channel = &network->channels[i];
        if (!channel->correlates)
            continue;
        film *f = &films[n++];
        *f = (film){.channel = channel, .window = window};
        code = tarry_predict_views(p, channel, &f->views, &why, error);
        const bool told = why != NULL; /* with its means */
        if (code == 0 && why == NULL)
            code = predict_film(p, f, &why, error);
        if (code == 0 && why != NULL && !told)
            code = tarry_predict_leave_out(p, channel->name, "its autocorrelation", why, error);
    }
    for (size_t i = 0; code == 0 && i < n; i++)
        for (size_t k = i + 1; code == 0 && k < n; k++)
            if (films[i].channel->signal != TARRY_NONE && films[k].channel->signal != TARRY_NONE &&
                films[i].level > 0 && films[k].level > 0)
                code = predict_pair(p, &films[i], &films[k], error);
    return code;
}

int tarry_predict_films(tarry_prediction *p, tarry_error *error) {
    const tarry_run_plan *run = &p->network->run;
    film *films = tarry_calloc(p->network->n_channels, sizeof *films);
    int code = films == NULL ? tarry_fail_memory(error, "a prediction") : 0;
    for (uint32_t w = 0; code == 0 && w < run->n_windows; w++)
        if (run->windows[w].frames.to >= run->windows[w].frames.from + 2)
            code = predict_window(p, &run->windows[w], films, error);
    free(films);
    return code;
}
