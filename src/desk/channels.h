/* channels.h - the channels of a recording that nobody has described yet. */
#ifndef LOPSIDE_DESK_CHANNELS_H
#define LOPSIDE_DESK_CHANNELS_H

#include <stdbool.h>
#include <stddef.h>

#include "read/fault.h"
#include "stream/job.h"

enum channels_use {
    CHANNELS_SENSOR, /* vibration, or what may be */
    CHANNELS_TACHO,  /* its signal, or failing that its name, is that of the only tacho */
    CHANNELS_TIME,   /* the time column */
    CHANNELS_OTHER   /* in a unit that is no vibration: a temperature, a speed */
};

struct channels_one {
    char channel[NAME_ROOM]; /* what the sheet calls it: number from 1, or a column's name */
    char name[NAME_ROOM];    /* a name for a sensor, different from all others */
    char unit[NAME_ROOM];    /* as the sheet spells it; "": not known */
    enum channels_use use;
    bool pulses; /* pulses at two levels, coming regularly */
};

struct channels {
    struct channels_one *items; /* owned */
    size_t count;
    bool text;        /* a text of columns; else a sound file */
    bool has_rate;    /* the file tells its rate, */
    double coarse_hz; /* or its time column does, but not finely enough; NaN: neither */
    double speed_rpm; /* by the tacho's pulses; NaN: unknown */
};

/* Looks at the recording. Returns a status; not STATUS_DONE: its line is in `fault`. */
int channels_find(struct channels *channels, const char *path, struct fault *fault)
    __attribute__((warn_unused_result));
void channels_release(struct channels *channels);

/* How the sheet spells a unit of vibration that a header gives ("m/s²", "ips"); NULL: it is none.
 */
const char *channels_unit(const char *text);

/* A name that the sheet takes, out of any text: what no name may hold becomes `_`. At most 40
 * bytes;
 * "" for a text without anything but blanks. */
void channels_name(const char *text, char name[NAME_ROOM]);

#endif
