/* stage.h - what a stage that takes files and no values of its own does with its arguments. */
#ifndef LOPSIDE_BASE_STAGE_H
#define LOPSIDE_BASE_STAGE_H

#include "base/options.h"

/* Names the stage for its messages (usage->stage), parses argv[1..] and hands the operands, which are
 * borrowed, to `loop`. Returns what that returns (base/status.h); STATUS_DONE after --help or
 * --version, STATUS_USAGE after misuse, which has been printed. */
int stage_run(const struct usage *usage, int argc, char **argv,
              int (*loop)(const struct option_list *files)) __attribute__((warn_unused_result));

#endif
