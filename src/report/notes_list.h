#ifndef TARRY_REPORT_NOTES_LIST_H
#define TARRY_REPORT_NOTES_LIST_H

/* Notes for reading: those that say the same of several names in one window become one. */

#include "base/text.h"
#include "tarry/results.h"

/* Append the warnings of the results, a paragraph each, in lines of at most `width` columns. */
void tarry_notes_list(const tarry_results *results, int width, tarry_text *text);

#endif
