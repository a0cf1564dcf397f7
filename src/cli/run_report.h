/* SPDX-License-Identifier: GPL-3.0-or-later
 * run_report.h: what `wend run` says at its end, on screen and in FOLDER/NAME_report.txt. */
#ifndef WEND_CLI_RUN_REPORT_H
#define WEND_CLI_RUN_REPORT_H

#include "run.h"
#include <stdio.h>

/** Measures and prints the closing table: books, super-steps, costs, resolution. Collective.
 *  stage: wall seconds of a stage on this rank. */
wend_status wend_run_report(wend_team *team, const wend_run *run, double stage);

/** Prints a time of the run in Myr. Local. */
double wend_run_myr(const wend_run *run, double time);

#endif
