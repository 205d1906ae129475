/* recording.h - writing simulated samples as WAV, FLAC, RF64 or CSV.
 *
 * data[frame * columns + column] holds volts for sound files, volts or the column's unit for CSV.
 */
#ifndef LOPSIDE_SIM_RECORDING_H
#define LOPSIDE_SIM_RECORDING_H

#include <stdbool.h>
#include <stddef.h>

#define RECORDING_COLUMNS 10

struct recording {
    const double *data; /* borrowed */
    size_t frames, columns;
    double rate_hz;
};

struct recording_csv {
    char separator, decimal;
    int digits[RECORDING_COLUMNS];        /* behind the decimal mark, one per column */
    const char *names[RECORDING_COLUMNS]; /* header row; names[0] NULL: no header row */
    const char *units[RECORDING_COLUMNS]; /* units row; units[0] NULL: none */
    const char *time_name;                /* NULL: no time column */
    int time_digits;
    int preamble;           /* lines before the header */
    bool crlf, bom, quoted; /* quoted: header cells in quotes */
};

/* container "wav", "rf64" or "flac"; bits 16, 24, 32 or 0 for float. Values beyond full_scale volts
 * are clipped. Returns 0, or -1 when it could not be written. */
int recording_sound(const char *path, const struct recording *recording, const char *container,
                    int bits, double full_scale) __attribute__((warn_unused_result));

/* Returns 0, or -1 when it could not be written. */
int recording_text(const char *path, const struct recording *recording,
                   const struct recording_csv *csv) __attribute__((warn_unused_result));

#endif
