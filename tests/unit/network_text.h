/* SPDX-License-Identifier: GPL-3.0-or-later */

#ifndef TARRY_TESTS_NETWORK_TEXT_H
#define TARRY_TESTS_NETWORK_TEXT_H

/* A network as lines of text, so that a test can write down by hand what it should be. */

#include "model/network.h"

/* Read `text` (YAML, minutes) into a network without signals, protocol and run: one segment with
 * the parameters as they stand. The network and what it points to last until the next call. */
const tarry_network *network_of(const char *text);

/* Notes made by the last network_of, one a line. */
const char *network_notes(void);

/* The same, but it must fail with TARRY_INPUT (or `code`) at this place with these words. */
void network_refused(const char *text, int line, int column, const char *words);
void network_refused_as(const char *text, tarry_code code, int line, int column, const char *words);

/* Free what the last network_of made. */
void network_end(void);

/* Each line by itself; the text stays valid until the next call.
 *
 *     "stage vela.nascent of 0"                       role, name, gene
 *     "vela.shut>open: 0.04 * vela.shut(1+0): -1 vela.shut, +1 vela.open, open 0"
 *     "1. vela.nascent elongation 2: 1 -1 vela.nascent, +1 vela.transcript" */
const char *species_text(const tarry_network *network);
const char *reactions_text(const tarry_network *network);
const char *lags_text(const tarry_network *network);

#endif
