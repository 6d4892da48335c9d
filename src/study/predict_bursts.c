/* SPDX-License-Identifier: GPL-3.0-or-later */

#include "study/predict.h"

#include "base/error.h"
#include "base/table.h"
#include "exact/bursts.h"
#include "tally/bins.h"
#include "tally/quantities.h"

#include <math.h>

/* Sizes and survivals below these are not told. */
static const double least_size = 1e-12, least_survival = 1e-6;

static void figures_of(const tarry_exact_bursts *b, double out[TARRY_N_BURST_QUANTITIES]) {
    const double loud = 1 - b->silent_fraction;
    out[TARRY_burst_frequency] = b->frequency;
    out[TARRY_burst_size_mean] = b->size_mean;
    out[TARRY_burst_size_sd] = b->size_sd;
    out[TARRY_silent_fraction] = b->silent_fraction;
    out[TARRY_loud_frequency] = b->frequency * loud;
    out[TARRY_loud_size_mean] = loud > 0 ? b->size_mean / loud : NAN;
    out[TARRY_active_time_mean] = b->active.mean;
    out[TARRY_inactive_time_mean] = b->inactive.mean;
    out[TARRY_interval_mean] = b->interval.mean;
    out[TARRY_interval_sd] = b->interval.sd;
    out[TARRY_active_fraction] = b->active_fraction;
    out[TARRY_initiation_rate] = b->initiation_rate;
    out[TARRY_outside_fraction] = b->outside_fraction;
}

static int tell_figures(tarry_prediction *p, const tarry_gene *gene, const char *window,
                        const tarry_exact_bursts *b, tarry_error *error) {
    double figures[TARRY_N_BURST_QUANTITIES];
    char room[64];
    int code = 0;
    figures_of(b, figures);
    for (tarry_burst_quantity i = 0; code == 0 && i < TARRY_N_BURST_QUANTITIES; i++)
        code = tarry_table_add(p->results->tables[TARRY_TABLE_bursts], error, gene->name, window,
                               tarry_burst_quantity_name(i),
                               tarry_burst_quantity_unit(p->network, gene, i, room), figures[i],
                               NAN, NAN, NAN);
    return code;
}

static int tell_sizes(tarry_prediction *p, const char *gene, const char *window,
                      const tarry_exact_bursts *b, tarry_error *error) {
    tarry_table *table = p->results->tables[TARRY_TABLE_burst_sizes];
    int code = 0;
    for (size_t n = 0; code == 0 && n < b->n_sizes;) {
        const uint32_t bin = tarry_bin_of((double)n);
        const double start = tarry_bin_start(bin), width = tarry_bin_width(bin);
        double sum = 0;
        for (; n < b->n_sizes && (double)n < start + width; n++)
            sum += b->sizes[n];
        if (sum >= least_size)
            code = tarry_table_add(table, error, gene, window, start, width, NAN, sum, NAN, NAN);
    }
    return code;
}

static int tell_dwell(tarry_prediction *p, const char *gene, const char *window, const char *period,
                      const tarry_exact_dwell *dwell, tarry_error *error) {
    tarry_table *table = p->results->tables[TARRY_TABLE_dwells];
    double times[TARRY_PREDICT_POINTS], survival = 1;
    int code = 0;
    tarry_predict_grid(2 * p->network->run.until, times);
    for (int i = 0; code == 0 && i < TARRY_PREDICT_POINTS && survival > least_survival; i++) {
        code = tarry_exact_dwell_survival(dwell, times[i], &survival, error);
        if (code == 0)
            code = tarry_table_add(table, error, gene, window, period, times[i], survival, NAN,
                                   NAN);
    }
    return code;
}

static int predict_window(tarry_prediction *p, uint32_t g, const tarry_window *window,
                          tarry_error *error) {
    const tarry_gene *gene = &p->network->genes[g];
    tarry_exact_bursts b;
    const char *why = NULL;
    if (p->n_cells > 1)
        return tarry_predict_leave_out(p, gene->name, "its bursts",
                                       "parameters differ from cell to cell", error);
    int code = tarry_exact_bursts_read(&p->genes[g], window->from, window->to, &p->arena, &b, &why,
                                       error);
    if (code != 0 || why != NULL)
        return code != 0 ? code : tarry_predict_leave_out(p, gene->name, "its bursts", why, error);
    code = tell_figures(p, gene, window->name, &b, error);
    if (code == 0)
        code = tell_sizes(p, gene->name, window->name, &b, error);
    if (code == 0)
        code = tell_dwell(p, gene->name, window->name, "active", &b.active, error);
    if (code == 0)
        code = tell_dwell(p, gene->name, window->name, "inactive", &b.inactive, error);
    return code;
}

int tarry_predict_bursts(tarry_prediction *p, tarry_error *error) {
    int code = 0;
    for (uint32_t g = 0; code == 0 && g < p->network->n_genes; g++)
        for (uint32_t w = 0; code == 0 && p->genes[g].why == NULL && w < p->network->run.n_windows;
             w++)
            code = predict_window(p, g, &p->network->run.windows[w], error);
    return code;
}
