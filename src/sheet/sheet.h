/* sheet.h - the job sheet: INI text to a job, and what `read` alone needs besides.
 *
 * Every error of a sheet is reported, each one line with file and line number, in one go.
 */
#ifndef LOPSIDE_SHEET_SHEET_H
#define LOPSIDE_SHEET_SHEET_H

#include "base/buffer.h"
#include "stream/job.h"

/* How a recording's files are laid out: [recording], overridden key by key in a [run]. */
struct sheet_layout {
    double full_scale;       /* V at digital full scale; NaN: absent */
    double rate;             /* Hz, for CSV without a time column; NaN: absent */
    char time_column[NAME_ROOM]; /* name or number; "none"; "": found by itself */
    char separator;          /* ',', ';', '\t'; 0: found by itself */
    char decimal;            /* '.', ','; 0: found by itself */
    int skip;                /* lines; -1: found by itself */
};

struct sheet_scale {
    bool given;              /* false: the column is in the sensor's unit already */
    double si_per_volt;      /* given: SI of the sensor's quantity per volt */
    double si_per_unit;      /* not given: SI per column unit */
};

struct sheet_run {
    int line;                /* of its header, for messages */
    char **files;            /* owned paths as written, relative to the sheet's folder */
    int *file_lines;
    size_t file_count;
    struct sheet_layout layout;
    char (*channels)[NAME_ROOM];  /* owned, one per sensor: this run's channel */
    struct sheet_scale *scales;   /* owned, one per sensor: this run's scale */
};

struct sheet {
    char *path;              /* owned, as given */
    char *folder;            /* owned: "." or the folder of the sheet */
    struct job job;
    struct sheet_layout layout;
    struct sheet_scale *scales; /* owned, one per sensor */
    struct sheet_run *runs;     /* owned, as job.runs */
};

/* Reads and validates the sheet. Returns 0; or the number of lines appended to `errors`, each
 * "SHEET:LINE: cause: 'name'\n" with no stage name in front; or -1 when memory is out.
 * Where it does not return 0 the sheet is left released. A sheet is at most 1 MiB.
 * With `audit` a sheet needs no runs, planes or angles, and its runs are not checked for files. */
int sheet_read(struct sheet *sheet, const char *path, bool audit, struct buffer *errors)
    __attribute__((warn_unused_result));

/* The same of `length` bytes of text, which it changes, in the place of a file; `path` names it. */
int sheet_read_text(struct sheet *sheet, const char *path, char *text, size_t length, bool audit,
                    struct buffer *errors) __attribute__((warn_unused_result));
void sheet_release(struct sheet *sheet); /* also twice, or after a failed sheet_read */

#endif
