/* SPDX-License-Identifier: GPL-3.0-or-later */

/* How long lags were, beside the law that was asked for, and how long the first response took. */
#include "report/figure_parts.h"

#include "base/number.h"
#include "tally/jackknife.h"
#include "tally/pooled_lags.h"

#include <math.h>
#include <string.h>

enum {
    CURVE = 200, /* points of a law */
    BARS = 50,   /* at most, about */
};

static const double tail = 0.001; /* share of lags that may lie beyond the picture, at each end */
static const double late = 0.01;  /* share that responds later than is shown */

/* ---- lags ----------------------------------------------------------------------------------- */

typedef struct lag_range {
    double from, to;
} lag_range;

/* Where all but the tails lie, and how many were drawn. */
static lag_range find_range(const tarry_figure_rows *rows, double *drawn) {
    lag_range range = {NAN, 0};
    double below = 0;
    *drawn = 0;
    for (size_t i = 0; i < rows->n; i++) {
        if (below < 1 - tail)
            range.to = tarry_figure_number(rows, i, "to");
        below += tarry_figure_number(rows, i, "share");
        if (below > tail && isnan(range.from))
            range.from = tarry_figure_number(rows, i, "from");
        *drawn += tarry_figure_number(rows, i, "drawn");
    }
    return range;
}

/* Bars that are wide enough to be seen: narrow bins (of short lags) are joined. The lags are
 * independent, so Wilson's interval on their number holds for what is joined. */
static void add_bars(const tarry_figure_rows *rows, const lag_range *range, double drawn,
                     tarry_plot *plot) {
    const double least = (range->to - range->from) / BARS;
    tarry_plot_add_series(plot, TARRY_SERIES_BARS, "drawn", 0);
    for (size_t i = 0; i < rows->n;) {
        const double from = tarry_figure_number(rows, i, "from");
        double to, share = 0;
        const size_t first = i;
        do {
            to = tarry_figure_number(rows, i, "to");
            share += tarry_figure_number(rows, i++, "share");
        } while (i < rows->n && to - from < least &&
                 tarry_figure_number(rows, i, "to") - from < 2 * least);
        tarry_estimate interval = tarry_wilson(share, drawn);
        if (i == first + 1)
            interval = (tarry_estimate){.low = tarry_figure_number(rows, first, "low"),
                                        .high = tarry_figure_number(rows, first, "high")};
        tarry_plot_add_wide_row(plot, 0.5 * (from + to), to - from, share, interval.low,
                                interval.high);
    }
}

/* A law without single values: shares of narrow stretches over their width. */
static void add_smooth_law(const tarry_law *law, const lag_range *range, tarry_plot *plot) {
    const double step = (range->to - range->from) / CURVE;
    for (int i = 0; i < CURVE; i++) {
        const double a = range->from + i * step, b = a + step;
        const double share = tarry_law_cdf(law, a) > 0.5
                                 ? tarry_law_survival(law, a) - tarry_law_survival(law, b)
                                 : tarry_law_cdf(law, b) - tarry_law_cdf(law, a);
        tarry_plot_add_wide_row(plot, 0.5 * (a + b), step, share, NAN, NAN);
    }
}

/* Any other: its shares of the bars' own bins. */
static void add_binned_law(const tarry_figure_rows *rows, tarry_plot *plot) {
    for (size_t i = 0; i < rows->n; i++) {
        const double from = tarry_figure_number(rows, i, "from");
        const double to = tarry_figure_number(rows, i, "to");
        tarry_plot_add_wide_row(plot, 0.5 * (from + to), to - from,
                                tarry_figure_number(rows, i, "law"), NAN, NAN);
    }
}

static bool has_single_values(const tarry_law *law) {
    switch (law->kind) {
    case TARRY_LAW_FIXED:
    case TARRY_LAW_VALUES:
        return true;
    case TARRY_LAW_MIX:
        for (size_t i = 0; i < law->n; i++)
            if (has_single_values(&law->parts[i]))
                return true;
        return false;
    case TARRY_LAW_TOTAL:
        for (size_t i = 0; i < law->n; i++)
            if (!has_single_values(&law->parts[i]))
                return false;
        return true;
    case TARRY_LAW_EXPONENTIAL:
    case TARRY_LAW_ERLANG:
    case TARRY_LAW_GAMMA:
    case TARRY_LAW_LOGNORMAL:
    case TARRY_LAW_NORMAL:
    case TARRY_LAW_UNIFORM:
    case TARRY_LAW_WEIBULL:
    case TARRY_LAW_BINS:
    case TARRY_N_LAWS:
        break;
    }
    return false;
}

static void add_lag(const tarry_figure_work *work, uint32_t lag, tarry_plot *plot,
                    tarry_figure_words *words) {
    const tarry_lag *of = &work->network->lags[lag];
    const tarry_figure_rows rows = tarry_figure_rows_of(work, TARRY_TABLE_lags, of->name);
    double drawn;
    if (rows.n < 2) /* a lag that is always the same needs no picture */
        return;
    const char *name = of->gene == TARRY_NONE ? of->name : tarry_figure_short_name(of->name);
    tarry_plot_panel *panel = tarry_plot_add_panel(plot, name);
    if (!panel)
        return;
    const lag_range range = find_range(&rows, &drawn);
    add_bars(&rows, &range, drawn, plot);
    panel->x_from = range.from;
    panel->x_to = range.to;
    if (!isnan(tarry_figure_number(&rows, 0, "law"))) {
        uint32_t s = work->network->n_segments - 1;
        while (s > 0 && work->network->segments[s].start >= work->network->run.until)
            s--;
        const tarry_law *law = &work->network->segments[s].laws[of->delay];
        const bool single = has_single_values(law);
        tarry_plot_add_series(plot, TARRY_SERIES_LAW, "law asked for", 0);
        if (single)
            add_binned_law(&rows, plot);
        else
            add_smooth_law(law, &range, plot);
    }
    tarry_text_printf(&words->caption, "%s%s: %.0f lags.", plot->n_panels > 1 ? " " : "", name,
                      drawn);
}

static bool belongs(const tarry_figure_subject *subject, const tarry_lag *lag) {
    return subject->gene ? lag->gene == (int32_t)subject->index : lag->gene == TARRY_NONE;
}

int tarry_figure_lags(tarry_figure_work *work, const tarry_figure_subject *subject,
                      tarry_error *error) {
    tarry_plot plot = {.x_label = work->length_label,
                       .y_label = "density",
                       .x_name = "length",
                       .y_name = "share",
                       .own_x = true};
    tarry_figure_words words = {.kind = "lags", .title = "Lags as drawn"};
    if (subject->of_signals)
        return 0;
    for (uint32_t i = 0; i < work->network->n_lags && plot.n_panels < TARRY_PLOT_PANELS; i++)
        if (belongs(subject, &work->network->lags[i]) &&
            !tarry_is_like_earlier_lag(work->network, i))
            add_lag(work, i, &plot, &words);
    tarry_text_add_string(&words.caption, " Bars: lags that began within the record, with 95 % "
                                          "intervals. Line: the law that the model asks for, "
                                          "where it is the same throughout.");
    tarry_text_printf(&words.alternative, "Bars: lengths of the lags of %s, beside their laws.",
                      subject->words);
    return tarry_figure_finish(work, subject, &plot, &words, error);
}

/* ---- first responses ------------------------------------------------------------------------ */

static const char *name_step(tarry_figure_work *work, double step, tarry_plot *plot) {
    char number[TARRY_NUMBER_SIZE];
    tarry_number_write_rounded(step, 5, number);
    const char *name = tarry_arena_format(&work->arena, "step at %s %s", number,
                                          work->network->time_unit);
    plot->failed = plot->failed || !name;
    return name ? name : "";
}

/* *end: the time by which nearly all have responded, of all curves. */
static void add_response(const tarry_figure_work *work, const char *name, const char *words,
                         double step, int colour, double *end, tarry_plot *plot) {
    const tarry_figure_rows rows = tarry_figure_rows_of(work, TARRY_TABLE_first, name);
    tarry_plot_add_series(plot, TARRY_SERIES_LINE, words, colour);
    for (size_t i = 0; i < rows.n; i++) {
        if (fabs(tarry_figure_number(&rows, i, "step") - step) > 0)
            continue;
        const double time = tarry_figure_number(&rows, i, "time");
        const double survival = tarry_figure_number(&rows, i, "survival");
        tarry_plot_add_row(plot, time, survival, tarry_figure_number(&rows, i, "low"),
                           tarry_figure_number(&rows, i, "high"));
        if (survival > late)
            *end = fmax(*end, time);
    }
    tarry_plot_drop_empty_series(plot);
}

static void add_exact_response(const tarry_figure_work *work, const char *name, double step,
                               tarry_plot *plot) {
    const tarry_figure_rows rows = tarry_figure_exact_rows_of(work, TARRY_TABLE_first, name);
    tarry_figure_add_exact_series(plot);
    for (size_t i = 0; i < rows.n; i++)
        if (fabs(tarry_figure_number(&rows, i, "step") - step) <= 0)
            tarry_plot_add_wide_row(plot, tarry_figure_number(&rows, i, "time"), 1,
                                    tarry_figure_number(&rows, i, "survival"), NAN, NAN);
    tarry_plot_drop_empty_series(plot);
}

/* What a gene's responses are called in `first`, or a signal's. */
static size_t name_responses(const tarry_figure_work *work, const tarry_figure_subject *subject,
                             const char *names[TARRY_PLOT_SERIES]) {
    const tarry_network *network = work->network;
    size_t n = 0;
    for (uint32_t f = 0; f < network->n_firsts && subject->gene && n < TARRY_PLOT_SERIES; f++)
        if (network->firsts[f].gene == subject->index)
            names[n++] = network->firsts[f].name;
    for (size_t i = 0; subject->of_signals && i < subject->n_channels && n < TARRY_PLOT_SERIES; i++)
        names[n++] = network->channels[subject->channels[i]].name;
    return n;
}

int tarry_figure_first(tarry_figure_work *work, const tarry_figure_subject *subject,
                       tarry_error *error) {
    const char *names[TARRY_PLOT_SERIES];
    const size_t n = name_responses(work, subject, names);
    tarry_plot plot = {.x_label = work->since_label,
                       .y_label = "share without a response",
                       .x_name = "time",
                       .y_name = "survival",
                       .own_x = true};
    tarry_figure_words words = {.kind = "first-responses", .title = "First responses"};
    for (uint32_t r = 0; r < work->network->n_responses && plot.n_panels < TARRY_PLOT_PANELS; r++) {
        const double step = work->network->responses[r].from;
        double end = 0;
        tarry_plot_panel *panel = n ? tarry_plot_add_panel(&plot, name_step(work, step, &plot))
                                    : NULL;
        if (!panel)
            break;
        for (size_t i = 0; i < n; i++) {
            const char *space = strrchr(names[i], ' ');
            add_response(work, names[i], space ? space + 1 : tarry_figure_short_name(names[i]),
                         step, (int)i, &end, &plot);
        }
        for (size_t i = 0; i < n; i++)
            add_exact_response(work, names[i], step, &plot);
        panel->x_from = 0;
        panel->x_to = end > 0 ? 1.1 * end : NAN;
        tarry_plot_drop_empty_panel(&plot);
    }
    tarry_text_add_string(&words.caption,
                          "Share of cells in which nothing has come yet, by the time since a step "
                          "of the protocol. Molecules that were on their way at the step count.");
    tarry_figure_add_band_words(work, &words.caption);
    tarry_text_printf(&words.alternative,
                      "Falling curves: how many cells have not yet responded, for %s.",
                      subject->words);
    return tarry_figure_finish(work, subject, &plot, &words, error);
}
