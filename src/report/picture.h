/* SPDX-License-Identifier: GPL-3.0-or-later */

#ifndef TARRY_REPORT_PICTURE_H
#define TARRY_REPORT_PICTURE_H

/* What is done to a picture once gnuplot has made it. */

#include "base/text.h"
#include "tarry/write.h"

/* Does it end as a picture of its kind does? A program that was cut short leaves half of one. */
bool tarry_picture_is_whole(tarry_figure_format format, const char *bytes, size_t n);

/* Replace the dates in a PDF by the first second of 1970, in place: the same model gives the same
 * bytes. Returns whether there were any. */
bool tarry_picture_fix_dates(char *bytes, size_t n);

/* Append the <svg> element of gnuplot's file as a page can hold it, beside others: ids begin with
 * `stem`, black is the colour of the text about it, without background, titles and empty groups. */
void tarry_picture_inline(const char *svg, const char *stem, tarry_text *out);

#endif
