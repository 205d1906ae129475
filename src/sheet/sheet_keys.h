/* sheet_keys.h - which sections and keys there are. */
#ifndef LOPSIDE_SHEET_SHEET_KEYS_H
#define LOPSIDE_SHEET_SHEET_KEYS_H

#include "sheet/sheet_errors.h"
#include "sheet/sheet_lines.h"

enum sheet_kind {
    SHEET_JOB,
    SHEET_ROTOR,
    SHEET_RECORDING,
    SHEET_TACHO,
    SHEET_SENSOR,
    SHEET_PLANE,
    SHEET_RUN,
    SHEET_AIM,
    SHEET_LIMITS,
    SHEET_KINDS
};

enum sheet_key_flag {
    SHEET_KEY_SUBJECT = 1, /* a name stands behind it: `weight wheel` */
    SHEET_KEY_AGAIN = 2    /* may stand more than once */
};

struct sheet_key {
    const char *name;
    unsigned flags;
    const char *unit; /* [limits] alone: of the check's figures; NULL: it has none */
};

/* Fills the sections' kind and name and the entries' key and subject. Unknown, doubled, empty, badly
 * named ones go to `errors`. Entries of a doubled section are moved into the first. */
void sheet_keys_check(struct sheet_lines *lines, struct sheet_errors *errors);

/* What is wrong with a name (up to 40 bytes, none of `: = ; # ]`, no blank at an end), or NULL. */
const char *sheet_keys_name_fault(const char *name);

#endif
