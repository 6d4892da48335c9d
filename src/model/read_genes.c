/* SPDX-License-Identifier: GPL-3.0-or-later */

#include "model/read_genes.h"

/* Genes -> lags, reactions and effects. A molecule goes from stage to stage: each completion takes
 * it out of one and puts it into the next, whose lag begins at that moment. Lags are made before
 * the effects that schedule them. */

#include "base/error.h"
#include "base/memory.h"
#include "base/notes.h"
#include "base/text.h"
#include "model/expect.h"
#include "model/like_genes.h"

#include <string.h>

enum { MOST_NOTES = 10, MOST_WORDS = 32 };

/* One product with the stages before it, and how it goes away. */
typedef struct product_plan {
    const char *name;         /* "vela.transcript" */
    const tarry_node *stages; /* or NULL */
    uint32_t n_stages;
    uint32_t first;   /* species of the first stage, or of the product where there is none */
    uint32_t species; /* of the product */
    bool decays;
    bool formula;
    uint32_t rate;
    bool lives;                     /* it has a lifetime: a lag of its own */
    const struct order_plan *order; /* where each allele has a lag of its own for the first stage */
    tarry_place place;
} product_plan;

int tarry_gene_reaction(const tarry_gene_work *work, const char *name, const tarry_factor *factors,
                        size_t n_factors, bool formula, uint32_t rate, int32_t allele,
                        tarry_draft *draft, tarry_place place, tarry_error *error) {
    if (name == NULL)
        return tarry_fail_memory(error, "a reaction");
    tarry_reaction reaction = {
        .name = name, .rate = rate, .gene = (int32_t)work->gene, .allele = allele, .place = place};
    const int code = tarry_builder_effect(work->builder, draft, &reaction.effect, error);
    if (code != 0)
        return code;
    return tarry_builder_reaction(work->builder, reaction, formula, factors, n_factors, error);
}

/* ---- lags ---------------------------------------------------------------------------------------
 */

/* The delay of a stage: in place, or under `lasts`. `lost`: the node of that key, or NULL. */
static int stage_delay(const tarry_entry *stage, const tarry_node **delay, const tarry_node **lost,
                       tarry_error *error) {
    static const char *const keys[] = {"lasts", "lost"};
    *delay = stage->node;
    *lost = NULL;
    if (stage->node->kind != TARRY_NODE_MAP || (tarry_node_get(stage->node, "lasts") == NULL &&
                                                tarry_node_get(stage->node, "lost") == NULL))
        return 0;
    int code = tarry_expect_keys(stage->node, stage->key, keys, 2, error);
    if (code == 0)
        code = tarry_expect_value(stage->node, stage->key, "lasts", delay, error);
    *lost = tarry_node_get(stage->node, "lost");
    return code;
}

/* The loss that competes with a dwell. Its rate is needed when a molecule enters. */
static int read_loss(tarry_gene_work *work, const tarry_node *lost, tarry_lag *lag,
                     tarry_error *error) {
    tarry_builder *builder = work->builder;
    bool formula = false;
    tarry_draft draft = {0};
    const char *what = tarry_arena_format(builder->arena, "%s loss", lag->name);
    if (what == NULL)
        return tarry_fail_memory(error, "a gene");
    lag->may_be_lost = true;
    int code = tarry_builder_rate(builder, lost, false, what, &formula, &lag->loss_rate, error);
    if (code == 0 && formula)
        code = tarry_fail_at(error, TARRY_INPUT, lost->place,
                             "the time to a loss is drawn when a molecule enters the stage, so its "
                             "rate cannot read species; use parameters");
    if (code == 0)
        code = tarry_draft_change(&draft, (uint32_t)lag->stage, -1, error);
    if (code == 0)
        code = tarry_builder_effect(builder, &draft, &lag->loss_effect, error);
    tarry_draft_release(&draft);
    return code;
}

/* How the molecules of a stage keep in order. */
typedef struct order_plan {
    bool in_order;
    double headway;
} order_plan;

/* `no_overtaking: true` and `headway: TIME` under `transcript`. */
static int read_order(tarry_gene_work *work, order_plan *plan, tarry_error *error) {
    const tarry_node *node = work->layout.transcript;
    const tarry_node *answer = tarry_node_get(node, "no_overtaking");
    const tarry_node *headway = tarry_node_get(node, "headway");
    int code = 0;
    if (answer != NULL)
        code = tarry_expect_answer(answer, "'no_overtaking'", &plan->in_order, error);
    if (code == 0 && headway != NULL && !plan->in_order)
        return tarry_fail_at(error, TARRY_INPUT, tarry_key_place(node, "headway"),
                             "'headway' goes with 'no_overtaking: true'");
    if (code == 0 && plan->in_order && work->layout.n_transcript_stages == 0)
        return tarry_fail_at(error, TARRY_INPUT, tarry_key_place(node, "no_overtaking"),
                             "'no_overtaking' keeps the first stage in order, and this transcript "
                             "has none; give it 'stages'");
    if (code == 0 && headway != NULL)
        code = tarry_builder_constant_value(work->builder, headway, TARRY_TIME, "'headway'",
                                            &plan->headway, error);
    if (code == 0 && !(plan->headway >= 0))
        code = tarry_fail_number(error, headway->place, "'headway' must be 0 or more, not ",
                                 plan->headway, "");
    return code;
}

/* Does a signal look at one allele's molecules of this species? */
static bool is_seen_by_allele(const tarry_builder *builder, const char *species) {
    const tarry_node *signals = tarry_node_get(builder->root, "signals");
    for (size_t i = 0; signals != NULL && signals->kind == TARRY_NODE_MAP && i < signals->n; i++) {
        const tarry_node *signal = signals->entries[i].node;
        if (signal->kind != TARRY_NODE_MAP || tarry_node_get(signal, "allele") == NULL)
            continue;
        const tarry_node *of = tarry_node_get(signal, "of"), *sum = tarry_node_get(signal, "sum");
        if (of != NULL && of->kind == TARRY_NODE_SCALAR && strcmp(of->text, species) == 0)
            return true;
        if (sum != NULL && sum->kind == TARRY_NODE_MAP && tarry_node_get(sum, species) != NULL)
            return true;
    }
    return false;
}

/* `lost`: may be NULL. `order`: NULL, or where each allele has a lag of its own. */
static int make_lag(tarry_gene_work *work, const tarry_node *delay, const tarry_node *lost,
                    const order_plan *order, uint32_t species, tarry_place place,
                    tarry_error *error) {
    tarry_builder *builder = work->builder;
    tarry_lag lag = {.name = builder->species.items[species].name,
                     .stage = (int32_t)species,
                     .promoter = TARRY_NONE,
                     .gene = (int32_t)work->gene,
                     .place = place};
    const uint32_t first = (uint32_t)builder->lags.n;
    uint32_t index = first;
    lag.in_order = order != NULL && order->in_order;
    lag.headway = order != NULL ? order->headway : 0;
    int code = tarry_builder_delay_index(builder, delay, &lag.delay, error);
    if (code == 0 && lost != NULL && lag.in_order)
        return tarry_fail_at(error, TARRY_INPUT, lost->place,
                             "'lost' does not go with 'no_overtaking' in the first stage: who is "
                             "lost would still hold up those behind; leave one of them out");
    if (code == 0 && lost != NULL)
        code = read_loss(work, lost, &lag, error);
    for (; code == 0 && lag.allele < (order != NULL ? work->layout.n_copies : 1); lag.allele++)
        code = tarry_builder_lag(builder, lag, &index, error);
    if (code == 0)
        builder->stage_lags.items[species] = (int32_t)first;
    return code;
}

static int make_stage_lags(tarry_gene_work *work, const product_plan *plan, tarry_error *error) {
    int code = 0;
    for (uint32_t i = 0; code == 0 && i < plan->n_stages; i++) {
        const tarry_entry *stage = &plan->stages->entries[i];
        const tarry_node *delay = NULL, *lost = NULL;
        code = stage_delay(stage, &delay, &lost, error);
        if (code == 0)
            code = make_lag(work, delay, lost, i == 0 ? plan->order : NULL, plan->first + i,
                            stage->place, error);
    }
    return code;
}

/* ---- reading ------------------------------------------------------------------------------------
 */

/* At most one of half_life, decay and lifetime. */
static int read_decay(tarry_gene_work *work, const tarry_node *node, product_plan *plan,
                      tarry_error *error) {
    const tarry_node *half_life = tarry_node_get(node, "half_life");
    const tarry_node *decay = tarry_node_get(node, "decay");
    const tarry_node *lifetime = tarry_node_get(node, "lifetime");
    if ((half_life != NULL) + (decay != NULL) + (lifetime != NULL) > 1)
        return tarry_fail_at(error, TARRY_INPUT, node->place,
                             "'%s' goes away by one of 'half_life', 'decay' and 'lifetime'; here "
                             "stand several",
                             plan->name);
    plan->decays = half_life != NULL || decay != NULL;
    plan->lives = lifetime != NULL;
    if (plan->decays) {
        const char *what = tarry_arena_format(work->builder->arena, "%s decay", plan->name);
        if (what == NULL)
            return tarry_fail_memory(error, "a gene");
        plan->place = tarry_key_place(node, half_life != NULL ? "half_life" : "decay");
        return tarry_builder_rate(work->builder, half_life != NULL ? half_life : decay,
                                  half_life != NULL, what, &plan->formula, &plan->rate, error);
    }
    if (!plan->lives)
        return 0;
    plan->place = tarry_key_place(node, "lifetime");
    return make_lag(work, lifetime, NULL, NULL, plan->species, plan->place, error);
}

static int read_product(tarry_gene_work *work, const tarry_node *node, const tarry_node *stages,
                        uint32_t n_stages, uint32_t first, const order_plan *order,
                        product_plan *plan, tarry_error *error) {
    *plan = (product_plan){.stages = stages, .n_stages = n_stages, .first = first, .order = order};
    plan->species = first + n_stages;
    plan->name = work->builder->species.items[plan->species].name;
    const int code = make_stage_lags(work, plan, error);
    return code == 0 ? read_decay(work, node, plan, error) : code;
}

/* The alleles have lags of their own for the first stage where they keep in order or are seen one
 * by one. */
static int read_transcript(tarry_gene_work *work, product_plan *plan, tarry_error *error) {
    const tarry_gene_layout *layout = &work->layout;
    const tarry_builder *builder = work->builder;
    const uint32_t first = tarry_layout_transcript(layout);
    order_plan order = {0};
    int code = read_order(work, &order, error);
    if (code != 0)
        return code;
    work->own_lags = layout->n_transcript_stages > 0 &&
                     (order.in_order ||
                      is_seen_by_allele(builder, builder->species.items[first].name));
    code = read_product(work, layout->transcript, layout->transcript_stages,
                        layout->n_transcript_stages, first, work->own_lags ? &order : NULL, plan,
                        error);
    plan->order = NULL; /* it ends here */
    if (work->own_lags)
        work->first_lag = (uint32_t)builder->stage_lags.items[first];
    return code;
}

/* ---- building -----------------------------------------------------------------------------------
 */

/* The completion of stage or lifetime `species`: it loses one, the next (if any) gains one. */
static int build_completion(tarry_gene_work *work, uint32_t species, bool last,
                            tarry_error *error) {
    tarry_builder *builder = work->builder;
    tarry_draft draft = {0};
    uint32_t effect = 0;
    int code = tarry_draft_change(&draft, species, -1, error);
    /* Only a product can have been taken away by something else meanwhile. */
    if (code == 0 && last)
        code = tarry_draft_demand(&draft, species, 1, error);
    if (code == 0 && !last)
        code = tarry_draft_make(&draft, builder, species + 1, 1, error);
    if (code == 0)
        code = tarry_builder_effect(builder, &draft, &effect, error);
    const uint32_t first = (uint32_t)builder->stage_lags.items[species];
    for (uint32_t i = first;
         code == 0 && i < builder->lags.n && builder->lags.items[i].stage == (int32_t)species; i++)
        code = tarry_builder_outcome(builder, i, 1, effect, error);
    tarry_draft_release(&draft);
    return code;
}

static int build_product(tarry_gene_work *work, const product_plan *plan, tarry_error *error) {
    int code = 0;
    for (uint32_t i = 0; code == 0 && i < plan->n_stages; i++)
        code = build_completion(work, plan->first + i, false, error);
    if (code == 0 && plan->lives)
        code = build_completion(work, plan->species, true, error);
    if (code != 0 || !plan->decays)
        return code;
    tarry_draft draft = {0};
    const char *name = tarry_arena_format(work->builder->arena, "%s decay", plan->name);
    const tarry_factor factor = {.species = plan->species, .used = 1};
    code = tarry_draft_change(&draft, plan->species, -1, error);
    if (code == 0)
        code = tarry_gene_reaction(work, name, &factor, 1, plan->formula, plan->rate, TARRY_NONE,
                                   &draft, plan->place, error);
    tarry_draft_release(&draft);
    return code;
}

/* How proteins are started. */
typedef struct translation_plan {
    const char *name;
    bool formula;
    uint32_t rate;
    uint32_t made; /* the first stage of the protein, or the protein */
    tarry_place place;
} translation_plan;

/* One molecule of `species` is translated. `name`: of the reaction. */
static int build_source(tarry_gene_work *work, const translation_plan *plan, const char *name,
                        uint32_t species, tarry_error *error) {
    const tarry_factor factor = {.species = species, .needed = 1};
    tarry_draft draft = {0};
    int code = tarry_draft_make(&draft, work->builder, plan->made, 1, error);
    if (code == 0)
        code = tarry_gene_reaction(work, name, &factor, 1, plan->formula, plan->rate, TARRY_NONE,
                                   &draft, plan->place, error);
    tarry_draft_release(&draft);
    return code;
}

/* The species that a name under `from` means: a stage of the transcript, or the transcript. */
static int find_source(const tarry_gene_work *work, const product_plan *transcript,
                       const tarry_node *name, uint32_t *species, tarry_error *error) {
    const char *words[MOST_WORDS] = {"transcript"};
    size_t n_words = 1;
    int code = tarry_expect_scalar(name, "a name under 'from'", error);
    if (code != 0)
        return code;
    *species = transcript->species;
    if (strcmp(name->text, "transcript") == 0)
        return 0;
    for (uint32_t i = 0; i < transcript->n_stages; i++) {
        const char *stage = transcript->stages->entries[i].key;
        *species = transcript->first + i;
        if (strcmp(stage, name->text) == 0)
            return 0;
        if (n_words < MOST_WORDS)
            words[n_words++] = stage;
    }
    const char *nearest = tarry_nearest_word(name->text, words, n_words);
    return tarry_fail_at(error, TARRY_INPUT, name->place,
                         "the transcript of '%s' has no stage '%s'%s%s%s", work->layout.name,
                         name->text, nearest == NULL ? "" : "; did you mean '",
                         nearest == NULL ? "" : nearest, nearest == NULL ? "" : "'?");
}

/* `from: [nascent, transcript]`: a reaction for each that is translated, in this order. */
static int build_sources(tarry_gene_work *work, const product_plan *transcript,
                         const translation_plan *plan, const tarry_node *from, tarry_error *error) {
    int code = tarry_expect_list(from, "'from'", error);
    if (code == 0 && from->n == 0)
        code = tarry_fail_at(error, TARRY_INPUT, from->place,
                             "'from' is empty; name what is translated, as in from: [transcript]");
    for (size_t i = 0; code == 0 && i < from->n; i++) {
        const tarry_node *node = from->entries[i].node;
        uint32_t species = 0;
        code = find_source(work, transcript, node, &species, error);
        for (size_t k = 0; code == 0 && k < i; k++)
            if (strcmp(from->entries[k].node->text, node->text) == 0)
                code = tarry_fail_at(error, TARRY_INPUT, node->place,
                                     "'from' names '%s' twice; leave one of them out", node->text);
        if (code != 0)
            return code;
        const char *name = tarry_arena_format(work->builder->arena, "%s from %s", plan->name,
                                              node->text);
        if (name == NULL)
            return tarry_fail_memory(error, "a gene");
        code = build_source(work, plan, from->n == 1 ? plan->name : name, species, error);
    }
    return code;
}

/* Proteins are started from finished transcripts, or from what `from` names. */
static int build_translation(tarry_gene_work *work, const product_plan *transcript,
                             const product_plan *protein, tarry_error *error) {
    tarry_builder *builder = work->builder;
    const tarry_node *node = work->layout.protein;
    const tarry_node *translation = NULL, *from = tarry_node_get(node, "from");
    translation_plan plan = {
        .name = tarry_arena_format(builder->arena, "%s.translation", work->layout.name),
        .made = protein->first,
        .place = tarry_key_place(node, "translation")};
    if (plan.name == NULL)
        return tarry_fail_memory(error, "a gene");
    int code = tarry_expect_value(node, "'protein'", "translation", &translation, error);
    if (code == 0)
        code = tarry_builder_rate(builder, translation, false, plan.name, &plan.formula, &plan.rate,
                                  error);
    if (code != 0)
        return code;
    return from == NULL ? build_source(work, &plan, plan.name, transcript->species, error)
                        : build_sources(work, transcript, &plan, from, error);
}

static int read_gene(tarry_builder *builder, const tarry_entry *entry, uint32_t gene,
                     tarry_error *error) {
    tarry_gene_work work = {.builder = builder, .gene = gene};
    tarry_gene_layout *layout = &work.layout;
    product_plan transcript = {0}, protein = {0};
    int code = tarry_gene_layout_read(entry, layout, error);
    layout->first = builder->gene_species.items[gene];
    if (code == 0)
        code = tarry_read_promoter(&work, error);
    if (code == 0 && layout->transcript != NULL)
        code = read_transcript(&work, &transcript, error);
    if (code == 0 && layout->protein != NULL)
        code = read_product(&work, layout->protein, layout->protein_stages,
                            layout->n_protein_stages, tarry_layout_protein(layout), NULL, &protein,
                            error);
    if (code == 0)
        code = tarry_build_promoter(&work, error);
    if (code == 0 && layout->transcript != NULL)
        code = build_product(&work, &transcript, error);
    if (code == 0 && layout->protein != NULL)
        code = build_translation(&work, &transcript, &protein, error);
    if (code == 0 && layout->protein != NULL)
        code = build_product(&work, &protein, error);
    return code;
}

/* ---- genes without bursts -----------------------------------------------------------------------
 */

/* Why the bursts of a gene cannot be told. */
static int note_untold(tarry_builder *builder, const tarry_gene *gene, const tarry_node *node,
                       tarry_error *error) {
    const uint32_t first = builder->promoters.items[gene->promoters.from].states.from;
    tarry_notes *notes = &builder->model->notes;
    if (!builder->states.items[first].active)
        return tarry_notes_add(notes, gene->place, error,
                               "no state of the gene '%s' is active, so it has no bursts: their "
                               "figures are left out. A state is active when it says 'initiates' "
                               "or stands in 'bursts_in'.",
                               gene->name);
    if (tarry_node_get(node, "bursts_in") != NULL)
        return tarry_notes_add(notes, gene->place, error,
                               "'bursts_in' of the gene '%s' names every state, so that one burst "
                               "cannot be told from the next: the figures of bursts are left out. "
                               "Leave the states out that lie between bursts.",
                               gene->name);
    return tarry_notes_add(notes, gene->place, error,
                           "every state of the gene '%s' initiates, so that one burst cannot be "
                           "told from the next: the figures of bursts are left out. Name the "
                           "states that are bursts with 'bursts_in: [STATE]'.",
                           gene->name);
}

/* A note each for the first few, one for the rest. */
static int note_all_untold(tarry_builder *builder, const tarry_node *map, tarry_error *error) {
    size_t n_untold = 0;
    int code = 0;
    for (size_t i = 0; code == 0 && i < builder->gene_entries.n; i++) {
        if (builder->genes.items[i].tells)
            continue;
        if (n_untold++ < MOST_NOTES)
            code = note_untold(builder, &builder->genes.items[i],
                               builder->gene_entries.items[i].entry.node, error);
    }
    if (code != 0 || n_untold <= MOST_NOTES)
        return code;
    return tarry_notes_add(&builder->model->notes, map->place, error,
                           "the bursts of %zu more genes cannot be told either.",
                           n_untold - MOST_NOTES);
}

int tarry_read_genes(tarry_builder *builder, tarry_error *error) {
    const tarry_node *map = tarry_node_get(builder->root, "genes");
    if (map == NULL)
        return 0;
    int code = 0;
    for (size_t i = 0; code == 0 && i < builder->gene_entries.n; i++) {
        const tarry_gene_entry *gene = &builder->gene_entries.items[i];
        tarry_like_enter(builder, gene);
        code = read_gene(builder, &gene->entry, (uint32_t)i, error);
    }
    tarry_like_enter(builder, NULL);
    return code == 0 ? note_all_untold(builder, map, error) : code;
}
