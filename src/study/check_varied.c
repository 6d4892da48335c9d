/* SPDX-License-Identifier: GPL-3.0-or-later */

/* Parameters that differ from cell to cell, and delays whose shape does. */

#include "study/check_page.h"

#include "base/error.h"
#include "base/number.h"
#include "model/variation.h"

/* ---- delays that are solved for ----------------------------------------------------------------
 */

static bool has_table(tarry_law_kind kind) {
    return kind == TARRY_LAW_GAMMA || kind == TARRY_LAW_LOGNORMAL || kind == TARRY_LAW_NORMAL;
}

/* The same in shape: one is the other in another unit of time (a drawer's rule, engine/draw.h). */
static bool same_shape(const tarry_law *one, const tarry_law *other) {
    if (one->kind == TARRY_LAW_ERLANG)
        return one->b == other->b;
    if (has_table(one->kind)) {
        const double a = one->a / one->b, b = other->a / other->b;
        return a - b <= 1e-12 * a && b - a <= 1e-12 * a;
    }
    for (size_t i = 0; one->parts != NULL && i < one->n; i++)
        if (!same_shape(&one->parts[i], &other->parts[i]))
            return false;
    return true;
}

/* Delays of a cell that is unlike the one in the middle in every factor. */
static int write_solved(tarry_page *page, tarry_error *error) {
    const tarry_network *network = page->network;
    tarry_cell_network cell = {0};
    int code = tarry_cell_network_init(&cell, network, error);
    for (uint32_t i = 0; code == 0 && i < network->variation->n; i++)
        cell.factors[i] = 1 + 0.1 / (i + 1.0);
    if (code == 0) {
        tarry_error fault = {0};
        code = tarry_cell_network_set(&cell, 0, &fault);
        /* Such a cell cannot be: a run will tell. Memory that is short is told now. */
        if (code != 0) {
            tarry_cell_network_release(&cell);
            return code == TARRY_MEMORY ? tarry_fail_memory(error, "a page about the model") : 0;
        }
    }
    for (uint32_t i = 0; code == 0 && i < network->n_lags; i++) {
        const uint32_t delay = network->lags[i].delay;
        if (!same_shape(&network->segments[0].laws[delay], &cell.network.segments[0].laws[delay]))
            tarry_text_printf(
                page->text,
                "  %s: the shape of its delay differs too, so that each one is solved "
                "for (slow)\n",
                network->lags[i].name);
    }
    tarry_cell_network_release(&cell);
    return code;
}

/* ---- the section -------------------------------------------------------------------------------
 */

static void put_number(tarry_page *page, size_t column, const char *before, double value) {
    char text[TARRY_NUMBER_SIZE];
    tarry_number_short(value, 4, text);
    tarry_sheet_cell(&page->sheet, column, "%s%s", before, text);
}

int tarry_page_varied(tarry_page *page, tarry_error *error) {
    const tarry_network *network = page->network;
    const tarry_variation *variation = network->variation;
    if (variation == NULL)
        return 0;
    tarry_page_head(page, "Parameters that differ from cell to cell", variation->n);
    for (uint32_t i = 0; i < variation->n && i < TARRY_CHECK_MOST; i++) {
        const tarry_varied *varied = &variation->varied[i];
        tarry_sheet_row(&page->sheet);
        tarry_sheet_cell(&page->sheet, 0, "%s", network->parameter_names[varied->parameter]);
        tarry_sheet_cell(&page->sheet, 1, "mean %s", variation->parameters[varied->parameter].text);
        put_number(page, 2, "cv ", tarry_law_sd(&varied->law));
        tarry_sheet_cell(&page->sheet, 3, "%s", tarry_law_family_of(varied->law.kind)->word);
    }
    tarry_page_list(page, variation->n < TARRY_CHECK_MOST ? variation->n : TARRY_CHECK_MOST,
                    variation->n, "parameters");
    tarry_text_add_string(page->text,
                          "  All else on this page is said of a cell with their means.\n");
    return write_solved(page, error);
}
