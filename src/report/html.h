/* SPDX-License-Identifier: GPL-3.0-or-later */

#ifndef TARRY_REPORT_HTML_H
#define TARRY_REPORT_HTML_H

/* HTML that is XML too: every element is closed, every attribute quoted, and all that comes from a
 * model or a command line is escaped. */

#include "base/text.h"

/* Append a text so that it is read as text, in an element or in a quoted attribute. Characters that
 * would not be seen, or would reorder what stands around them (control characters, marks of writing
 * direction), are shown by number as [U+202E]; bytes that are no UTF-8 as U+FFFD. */
void tarry_html_text(tarry_text *out, const char *text);

/* The same for n bytes in which line ends and tabs are kept, for <pre>. */
void tarry_html_lines(tarry_text *out, const char *text, size_t n);

/* Append markup. Every %s in it is a text and is escaped; there is nothing else but %%. */
void tarry_html_put(tarry_text *out, const char *markup, ...) __attribute__((format(printf, 2, 3)));

#endif
