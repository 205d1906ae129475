/* interview.h - asks on a terminal for what a sheet still lacks; each answer is read as the sheet reads it. */
#ifndef LOPSIDE_DESK_INTERVIEW_H
#define LOPSIDE_DESK_INTERVIEW_H

#include "desk/channels.h"
#include "desk/outline.h"

#define INTERVIEW_PLANES 16 /* that can be named in an answer */

struct interview {
    struct outline *outline;   /* borrowed: its answers, planes and weights are completed */
    struct channels *channels; /* borrowed: its sensors are named */
    const char **output;       /* borrowed: the file to write to */
    bool planes_given, weights_given;
    const char *planes[INTERVIEW_PLANES];
    struct outline_weight *weights; /* owned */
    char **typed;                   /* owned: what the answers point to */
    size_t typed_count;
};

/* Questions on standard error, answers from standard input. STATUS_DONE; STATUS_USAGE where the answers
 * ended early, which was said; STATUS_SYSTEM. `outline` points into the interview afterwards. */
int interview_hold(struct interview *interview) __attribute__((warn_unused_result));
void interview_release(struct interview *interview); /* also when all zero */

/* Reads `KEY = VALUE` below the section's head HEAD, with the lines `rest` behind, as a sheet. The first
 * fault of that line is in `why`, which is empty where there is none. 0, or -1 when memory is out. */
int interview_judge(const char *head, const char *key, const char *value, const char *rest,
                    char *why, size_t room) __attribute__((warn_unused_result));

#endif
