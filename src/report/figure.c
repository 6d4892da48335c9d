#include "report/figure.h"

#include <stdlib.h>

static void release(tarry_figure *figure) {
    free(figure->stem);
    free(figure->title);
    free(figure->caption);
    free(figure->alternative);
    free(figure->script);
    free(figure->data);
    free(figure->svg);
}

void tarry_figure_list_release(tarry_figure_list *list) {
    for (size_t i = 0; i < list->n; i++)
        release(&list->items[i]);
    free(list->items);
    free(list->left_out);
    *list = (tarry_figure_list){0};
}
