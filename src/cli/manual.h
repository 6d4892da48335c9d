/* SPDX-License-Identifier: GPL-3.0-or-later */

#ifndef TARRY_CLI_MANUAL_H
#define TARRY_CLI_MANUAL_H

/* The same tables of commands and options as a manual page, and as completions for shells. */

/* Write `kind` ("man", "bash" or "zsh") to standard output; returns the exit status. */
int tarry_manual_write(const char *kind);

#endif
