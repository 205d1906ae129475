/* outline.h - writes a commented job sheet out of what is known; what is not stands in it as a
 * comment to be completed. Nothing that decides the answer is made up. */
#ifndef LOPSIDE_DESK_OUTLINE_H
#define LOPSIDE_DESK_OUTLINE_H

#include <stddef.h>

#include "base/buffer.h"
#include "desk/channels.h"

/* Texts as the sheet takes them. NULL or "": not known. */
struct outline_answers {
    const char *title, *angles, *tacho, *unit, *scale, *full_scale, *rate, *mass, *speed, *radius,
        *positions, *stock, *target, *grade, *units, *show;
};

struct outline_weight {
    size_t run, plane;
    const char *text; /* 60 g at position 2 */
};

struct outline {
    struct outline_answers answers;
    const struct channels *channels;
    const char *const *planes; /* names, at least one */
    size_t plane_count;
    const char (*runs)[NAME_ROOM]; /* names */
    const char *const *files;      /* their recordings, as the sheet is to name them */
    size_t run_count;
    const struct outline_weight *weights;
    size_t weight_count;
};

/* Appends the sheet to `text`; text->failed says whether memory ran out. */
void outline_write(const struct outline *outline, struct buffer *text);

/* Appends a line for each comment in the sheet that a correction needs: "'radius' in [plane wheel]\n".
 * `doubtful`: the scale and full scale of sound files, too, which a recording may do without. */
void outline_missing(const struct outline *outline, bool doubtful, struct buffer *lines);

/* Appends a value, not "", as the sheet reads it back: quoted where that is needed. */
void outline_value(struct buffer *text, const char *value);

#endif
