/* SPDX-License-Identifier: GPL-3.0-or-later */

/* libyaml's events come one after another, so the tree is built with a stack of open maps and lists
 * and no recursion; the stack has a fixed height, which is the limit of nesting. Entries of an open
 * collection are gathered in a heap array that its level keeps for the next one, and copied to the
 * arena when the collection closes. Everything is linear in the size of the file: a map's keys are
 * hashed once, and places in the text are found by a cursor that moves with the events. */
#include "model/yaml.h"

#include "base/error.h"
#include "base/text.h"
#include "model/mend.h"
#include "model/utf8.h"

#include <limits.h>
#include <stdlib.h>
#include <string.h>
#include <yaml.h>

#define HASH_NONFATAL_OOM 1
#define uthash_malloc(size) tarry_calloc(1, size)
#define uthash_free(pointer, size) free(pointer)
#include <uthash.h>

enum { DEEPEST = 64 };

/* A key of the map that is being closed. */
typedef struct seen_key {
    const tarry_entry *entry;
    UT_hash_handle hh;
} seen_key;

/* An open map or list. */
typedef struct level {
    tarry_node *node;
    bool flow;             /* written with { } or [ ] */
    const char *key;       /* the key whose value is due, or NULL */
    tarry_place key_place; /* of that key */
    tarry_entry *entries;  /* heap; kept from one collection to the next */
    size_t n, capacity;
} level;

typedef struct reader {
    yaml_parser_t parser;
    const char *text;
    size_t size;
    const char *file;
    tarry_arena *arena;
    level levels[DEEPEST];
    int depth;      /* levels in use */
    seen_key *seen; /* scratch for one map's keys */
    size_t seen_capacity;
    const tarry_node *root;
    size_t n_documents;
    size_t cursor_index; /* characters before the cursor */
    size_t cursor;       /* bytes before it */
} reader;

/* ---- places --------------------------------------------------------------------------------- */

static int clip(size_t n) {
    return n < INT_MAX ? (int)n + 1 : INT_MAX;
}

static tarry_place place_of(const reader *in, yaml_mark_t mark) {
    return (tarry_place){in->file, clip(mark.line), clip(mark.column)};
}

static bool continues(char c) {
    return ((unsigned char)c & 0xc0) == 0x80;
}

/* The byte at which a mark stands. Those of starting events come in order. */
static size_t byte_of(reader *in, yaml_mark_t mark) {
    while (in->cursor_index < mark.index && in->cursor < in->size) {
        do
            in->cursor++;
        while (in->cursor < in->size && continues(in->text[in->cursor]));
        in->cursor_index++;
    }
    return in->cursor;
}

/* ---- what libyaml finds wrong ---------------------------------------------------------------- */

/* libyaml's word for a fault (its beginning) and ours, which says what would be right. */
static const struct {
    const char *theirs;
    const char *ours;
} problems[] = {
    {"mapping values are not allowed in this context",
     "a ':' does not fit here: one line holds one 'key: value', indented as the line before it, "
     "and "
     "a text with ': ' in it stands in quotes"},
    {"block sequence entries are not allowed in this context",
     "a '- ' does not fit here: a list begins on the line after its key"},
    {"mapping keys are not allowed in this context",
     "a '? ' does not fit here: write 'key: value'"},
    {"could not find expected ':'", "a ':' is missing: a line in a map is 'key: value'"},
    {"did not find expected key",
     "this does not fit: in a map every line is 'key: value', all indented alike"},
    {"did not find expected '-' indicator",
     "this does not fit: in a list every item begins with '- ', all indented alike"},
    {"did not find expected ',' or ']'", "a ',' or ']' is missing in the list that began with '['"},
    {"did not find expected ',' or '}'", "a ',' or '}' is missing in the map that began with '{'"},
    {"did not find expected node content", "a value is missing here"},
    {"found unexpected end of stream", "the file ends inside a text in quotes: close the quotes"},
    {"found unexpected document indicator", "a '---' or '...' stands inside a text in quotes"},
    {"found unknown escape character",
     "this '\\' means nothing inside \" \": write '\\\\', or put the text in ' '"},
    {"did not find expected hexdecimal number", "hexadecimal digits are missing after the '\\'"},
    {"found invalid Unicode character escape code", "this '\\' names no Unicode character"},
    {"found a tab character", "a tab cannot indent a line; use blanks"},
    {"did not find expected comment or line break",
     "after '|' or '>' the line ends and the text begins on the next"},
    {"did not find expected <document start>", "this does not fit: a model is one map of "
                                               "'key: value' lines, all indented alike"},
    {"did not find expected alphabetic or numeric character",
     "a text that begins with '*' or '&' stands in quotes"},
    {"did not find expected whitespace or line break",
     "tags ('!...') are not read; leave them out"},
    {"could not find expected directive name", "a line cannot begin with '%'; leave it out"},
    {"found unknown directive name", "a line cannot begin with '%'; leave it out"},
    {"found undefined tag handle", "tags ('!...') are not read; leave them out"},
    {"did not find expected tag URI", "tags ('!...') are not read; leave them out"},
    {"did not find URI escaped octet", "tags ('!...') are not read; leave them out"},
    {"did not find the expected '>'", "tags ('!...') are not read; leave them out"},
    {"found an incorrect ", "tags ('!...') are not read; leave them out"},
    {"found incompatible YAML document", "a line cannot begin with '%'; leave it out"},
    {"found duplicate %", "a line cannot begin with '%'; leave it out"},
    {"found unexpected non-alphabetical character", "a line cannot begin with '%'; leave it out"},
    {"found extremely long version number", "a line cannot begin with '%'; leave it out"},
    {"did not find expected version number", "a line cannot begin with '%'; leave it out"},
    {"did not find expected digit or '.' character", "a line cannot begin with '%'; leave it out"},
    {"did not find expected '!'", "a line cannot begin with '%'; leave it out"},
    {"did not find expected whitespace", "a line cannot begin with '%'; leave it out"},
    {"found unexpected ':'", "a blank follows the ':' of 'key: value', and a text with ':' in it "
                             "stands in quotes"},
    {"found an indentation indicator equal to 0", "no 0 can follow '|' or '>'; leave it out"},
};

static int fail_start(reader *in, tarry_place place, size_t at, tarry_error *error) {
    if (at < in->size && in->text[at] == '\t')
        return tarry_fail_at(error, TARRY_INPUT, place, "a tab cannot indent a line; use blanks");
    return tarry_fail_at(error, TARRY_INPUT, place,
                         "a text cannot begin with '%c'; put it in quotes",
                         at < in->size ? in->text[at] : ' ');
}

static int fail_parser(reader *in, tarry_error *error) {
    const yaml_parser_t *parser = &in->parser;
    if (parser->error == YAML_MEMORY_ERROR)
        return tarry_fail_memory(error, "the model's text");
    const char *problem = parser->problem != NULL ? parser->problem : "this cannot be read";
    tarry_place place = place_of(in, parser->problem_mark);
    if (strcmp(problem, "found character that cannot start any token") == 0)
        return fail_start(in, place, byte_of(in, parser->problem_mark), error);
    const char *ours = NULL;
    for (size_t i = 0; i < sizeof problems / sizeof *problems && ours == NULL; i++)
        if (strncmp(problem, problems[i].theirs, strlen(problems[i].theirs)) == 0)
            ours = problems[i].ours;
    return tarry_fail_at(error, TARRY_INPUT, place, "%s%s",
                         ours != NULL ? "" : "this is no YAML: ", ours != NULL ? ours : problem);
}

/* ---- building -------------------------------------------------------------------------------- */

static int check_keys(reader *in, const tarry_node *map, tarry_error *error) {
    if (tarry_grow((void **)&in->seen, &in->seen_capacity, map->n, sizeof *in->seen))
        return tarry_fail_memory(error, "the keys of a map");
    seen_key *head = NULL;
    int code = 0;
    for (size_t i = 0; i < map->n && code == 0; i++) {
        const tarry_entry *entry = &map->entries[i];
        seen_key *twin = NULL, *key = &in->seen[i];
        HASH_FIND_STR(head, entry->key, twin);
        if (twin != NULL) {
            code = tarry_fail_at(error, TARRY_INPUT, entry->place,
                                 "the key '%s' stands twice in this map, first in line %d; remove "
                                 "one",
                                 entry->key, twin->entry->place.line);
            continue;
        }
        *key = (seen_key){.entry = entry};
        HASH_ADD_KEYPTR(hh, head, entry->key, strlen(entry->key), key);
        if (key->hh.tbl == NULL)
            code = tarry_fail_memory(error, "the keys of a map");
    }
    HASH_CLEAR(hh, head);
    return code;
}

/* Put a finished or opened node where the innermost open collection expects one. */
static int attach(reader *in, tarry_node *node, tarry_error *error) {
    if (in->depth == 0) {
        in->root = node;
        return 0;
    }
    level *top = &in->levels[in->depth - 1];
    bool map = top->node->kind == TARRY_NODE_MAP;
    if (map && top->key == NULL) {
        if (node->kind != TARRY_NODE_SCALAR)
            return tarry_fail_at(error, TARRY_INPUT, node->place,
                                 "a map or list stands where a key is due; write 'key: value'");
        if (node->text[0] == '\0')
            return tarry_fail_at(error, TARRY_INPUT, node->place,
                                 "a key is missing before ':'; write 'key: value'");
        if (!node->quoted && strcmp(node->text, "<<") == 0)
            return tarry_fail_at(error, TARRY_INPUT, node->place,
                                 "merge keys ('<<') are not read; write the keys out");
        top->key = node->text;
        top->key_place = node->place;
        return 0;
    }
    if (tarry_grow((void **)&top->entries, &top->capacity, top->n + 1, sizeof *top->entries))
        return tarry_fail_memory(error, "the model's text");
    top->entries[top->n++] = (tarry_entry){top->key, map ? top->key_place : node->place, node};
    top->key = NULL;
    return 0;
}

static int refuse_name(tarry_place place, bool tag, tarry_error *error) {
    if (tag)
        return tarry_fail_at(error, TARRY_INPUT, place,
                             "tags ('!...') are not read; leave them out");
    return tarry_fail_at(error, TARRY_INPUT, place,
                         "anchors ('&...') are not read; write the value out where it is used");
}

static int open_level(reader *in, const yaml_event_t *event, tarry_node_kind kind, bool flow,
                      tarry_error *error) {
    tarry_place place = place_of(in, event->start_mark);
    if (in->depth == DEEPEST)
        return tarry_fail_at(error, TARRY_INPUT, place,
                             "maps and lists are nested deeper than %d here", (int)DEEPEST);
    tarry_node *node = tarry_arena_calloc(in->arena, 1, sizeof *node);
    if (node == NULL)
        return tarry_fail_memory(error, "the model's text");
    node->kind = kind;
    node->place = place;
    int code = attach(in, node, error);
    if (code != 0)
        return code;
    level *top = &in->levels[in->depth++];
    top->node = node;
    top->flow = flow;
    top->key = NULL;
    top->n = 0;
    return 0;
}

static int close_level(reader *in, tarry_error *error) {
    level *top = &in->levels[--in->depth];
    tarry_node *node = top->node;
    tarry_entry *entries = tarry_arena_calloc(in->arena, top->n, sizeof *entries);
    if (entries == NULL)
        return tarry_fail_memory(error, "the model's text");
    if (top->n > 0)
        memcpy(entries, top->entries, top->n * sizeof *entries);
    node->entries = entries;
    node->n = top->n;
    return node->kind == TARRY_NODE_MAP ? check_keys(in, node, error) : 0;
}

static int fail_split(reader *in, const tarry_node *node, size_t at, tarry_error *error) {
    tarry_text line = {0};
    bool mended = tarry_mend_line(in->text, in->size, at, &line);
    int code = 0;
    if (line.failed)
        code = tarry_fail_memory(error, "a message");
    else if (mended)
        code = tarry_fail_at(error, TARRY_INPUT, node->place,
                             "the commas of a call part it here, inside { } or [ ]; put the "
                             "expression in quotes: %s",
                             line.data);
    else
        code = tarry_fail_at(error, TARRY_INPUT, node->place,
                             "'%s' ends here, with a '(' that is not closed; inside { } or [ ] an "
                             "expression with a comma or bracket stands in quotes",
                             node->text);
    tarry_text_release(&line);
    return code;
}

static bool has_control(const char *text) {
    for (const char *c = text; *c != '\0'; c++)
        if (((unsigned char)*c < 0x20 && *c != '\n' && *c != '\t') || *c == 0x7f)
            return true;
    return false;
}

static int add_scalar(reader *in, const yaml_event_t *event, tarry_error *error) {
    const char *value = (const char *)event->data.scalar.value;
    size_t length = event->data.scalar.length;
    yaml_scalar_style_t style = event->data.scalar.style;
    tarry_node *node = tarry_arena_calloc(in->arena, 1, sizeof *node);
    char *text = tarry_arena_text(in->arena, value, length);
    if (node == NULL || text == NULL)
        return tarry_fail_memory(error, "the model's text");
    node->kind = TARRY_NODE_SCALAR;
    node->place = place_of(in, event->start_mark);
    node->text = text;
    node->quoted = style != YAML_PLAIN_SCALAR_STYLE;
    if (style == YAML_SINGLE_QUOTED_SCALAR_STYLE || style == YAML_DOUBLE_QUOTED_SCALAR_STYLE)
        node->place.column++;
    if (strlen(text) != length || has_control(text))
        return tarry_fail_at(error, TARRY_INPUT, node->place,
                             "this text holds a control character; remove it");
    if (in->depth > 0 && in->levels[in->depth - 1].flow && !node->quoted &&
        tarry_mend_is_split(text, length))
        return fail_split(in, node, byte_of(in, event->start_mark), error);
    return attach(in, node, error);
}

/* ---- events ---------------------------------------------------------------------------------- */

static int start_document(reader *in, const yaml_event_t *event, tarry_error *error) {
    tarry_place place = place_of(in, event->start_mark);
    if (event->data.document_start.tag_directives.start !=
        event->data.document_start.tag_directives.end)
        return refuse_name(place, true, error);
    if (in->n_documents++ > 0)
        return tarry_fail_at(error, TARRY_INPUT, place,
                             "a second document begins here; one file holds one model");
    return 0;
}

/* Tags and anchors may stand before any node. libyaml drops a lone `!`, so the text is asked. */
static int refuse_properties(reader *in, const yaml_event_t *event, tarry_error *error) {
    const yaml_char_t *anchor = NULL;
    switch (event->type) {
    case YAML_SCALAR_EVENT:
        anchor = event->data.scalar.anchor;
        break;
    case YAML_SEQUENCE_START_EVENT:
        anchor = event->data.sequence_start.anchor;
        break;
    case YAML_MAPPING_START_EVENT:
        anchor = event->data.mapping_start.anchor;
        break;
    case YAML_ALIAS_EVENT:
        return tarry_fail_at(error, TARRY_INPUT, place_of(in, event->start_mark),
                             "aliases ('*%s') are not read; write the value out",
                             (const char *)event->data.alias.anchor);
    default:
        return 0;
    }
    size_t at = byte_of(in, event->start_mark);
    char first = at < in->size ? in->text[at] : ' ';
    if (anchor == NULL && first != '!')
        return 0;
    return refuse_name(place_of(in, event->start_mark), first == '!', error);
}

static int take(reader *in, const yaml_event_t *event, tarry_error *error) {
    int code = refuse_properties(in, event, error);
    if (code != 0)
        return code;
    switch (event->type) {
    case YAML_DOCUMENT_START_EVENT:
        return start_document(in, event, error);
    case YAML_SCALAR_EVENT:
        return add_scalar(in, event, error);
    case YAML_SEQUENCE_START_EVENT:
        return open_level(in, event, TARRY_NODE_LIST,
                          event->data.sequence_start.style == YAML_FLOW_SEQUENCE_STYLE, error);
    case YAML_MAPPING_START_EVENT:
        return open_level(in, event, TARRY_NODE_MAP,
                          event->data.mapping_start.style == YAML_FLOW_MAPPING_STYLE, error);
    case YAML_SEQUENCE_END_EVENT:
    case YAML_MAPPING_END_EVENT:
        return close_level(in, error);
    default:
        return 0;
    }
}

static int read_events(reader *in, tarry_error *error) {
    for (bool over = false; !over;) {
        yaml_event_t event;
        if (!yaml_parser_parse(&in->parser, &event))
            return fail_parser(in, error);
        over = event.type == YAML_STREAM_END_EVENT;
        int code = take(in, &event, error);
        yaml_event_delete(&event);
        if (code != 0)
            return code;
    }
    const tarry_node *root = in->root;
    if (root == NULL || (root->kind == TARRY_NODE_SCALAR && root->text[0] == '\0'))
        return tarry_fail_at(error, TARRY_INPUT, (tarry_place){in->file, 1, 1},
                             "there is nothing in this file; a model begins with 'tarry: 1'");
    return 0;
}

static void release(reader *in) {
    yaml_parser_delete(&in->parser);
    for (int i = 0; i < DEEPEST; i++)
        free(in->levels[i].entries);
    free(in->seen);
}

int tarry_yaml_read(const char *text, size_t size, const char *file, tarry_arena *arena,
                    const tarry_node **root, tarry_error *error) {
    if (size >= 3 && memcmp(text, "\xef\xbb\xbf", 3) == 0) { /* a byte order mark */
        text += 3;
        size -= 3;
    }
    int code = tarry_utf8_check(text, size, file, error);
    if (code != 0)
        return code;
    reader in = {.text = text, .size = size, .file = file, .arena = arena};
    if (!yaml_parser_initialize(&in.parser))
        return tarry_fail_memory(error, "the model's text");
    yaml_parser_set_encoding(&in.parser, YAML_UTF8_ENCODING);
    yaml_parser_set_input_string(&in.parser, (const unsigned char *)text, size);
    code = read_events(&in, error);
    if (code == 0)
        *root = in.root;
    release(&in);
    return code;
}

const tarry_node *tarry_node_get(const tarry_node *map, const char *key) {
    for (size_t i = 0; i < map->n; i++)
        if (map->entries[i].key != NULL && strcmp(map->entries[i].key, key) == 0)
            return map->entries[i].node;
    return NULL;
}
