/* SPDX-License-Identifier: GPL-3.0-or-later */

#ifndef TARRY_MODEL_LIKE_GENES_H
#define TARRY_MODEL_LIKE_GENES_H

/* Genes that stand in the file once and are there many times over: `many: 10000` under vela gives
 * vela_1 to vela_10000. Within its own expressions the common name means the copy itself; anywhere
 * else it means nothing. What like genes have in common is read once. */

#include "model/builder.h"

enum { TARRY_MOST_LIKE = 1000000 };

/* Enter the genes under `genes:` one by one into builder->gene_entries, with names of their own. */
int tarry_list_genes(tarry_builder *builder, tarry_error *error);

/* While a gene is read, its common name stands for it; NULL: none does any more. */
void tarry_like_enter(tarry_builder *builder, const tarry_gene_entry *gene);

/* The like genes that name[0..n), up to its first dot, is the common name of, or NULL. */
const tarry_like_genes *tarry_like_find(const tarry_builder *builder, const char *name, size_t n);

/* What a name such as "vela.protein" means in the gene that is read: "vela_7.protein", put into
 * `out`; false where it means nothing of that kind. */
bool tarry_like_own(const tarry_builder *builder, const char *name, size_t n, char *out,
                    size_t size);

/* TARRY_INPUT for a common name where one gene is due. */
int tarry_like_fail(const tarry_like_genes *like, const char *name, tarry_place place,
                    tarry_error *error);

/* The index that a rate or delay written at this node has been given by a like gene before, and
 * keeping it. Nothing is kept while no like gene is read. */
bool tarry_like_shared(const tarry_builder *builder, const tarry_node *node, uint32_t *index);
int tarry_like_share(tarry_builder *builder, const tarry_node *node, uint32_t index,
                     tarry_error *error);

void tarry_like_release(tarry_builder *builder);

#endif
