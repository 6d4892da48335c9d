/* SPDX-License-Identifier: GPL-3.0-or-later */

/* What a channel sees of a transcript and its proteins, by its first two moments. Where no proteins
 * are seen the second moment is that of glimpses; else it is a derivative of E[exp(s r)], from
 * which only what is of second order in s is left out. */

#include "exact/carried.h"

#include "exact/translated.h"

static int find_second(const tarry_exact_gene *gene, const tarry_exact_view *view, double horizon,
                       tarry_curve *second, tarry_error *error) {
    tarry_translated t = {0};
    int code = tarry_exact_glimpses_mean(&gene->protein, &view->protein, horizon, &t.seen[0],
                                         error);
    if (code == 0)
        code = tarry_exact_glimpses_square(&gene->protein, &view->protein, horizon, &t.seen[1],
                                           error);
    if (code == 0)
        code = tarry_translated_init(&t, &gene->transcript, &view->transcript, horizon, error);
    if (code == 0)
        code = tarry_translated_second(&t, true, second, error);
    tarry_translated_release(&t);
    return code;
}

int tarry_exact_carry_view(const tarry_exact_gene *gene, const tarry_exact_view *view,
                           double horizon, tarry_exact_carried *carried, tarry_error *error) {
    *carried = (tarry_exact_carried){.is_plain = true};
    int code = tarry_exact_view_mean(gene, view, horizon, &carried->mean, error);
    if (code == 0 && view->protein.n > 0)
        code = find_second(gene, view, horizon, &carried->second, error);
    else if (code == 0)
        code = tarry_exact_glimpses_square(&gene->transcript, &view->transcript, horizon,
                                           &carried->second, error);
    const double end = tarry_curve_end(&carried->mean), other = tarry_curve_end(&carried->second);
    carried->load.horizon = end > other ? end : other;
    return code;
}
