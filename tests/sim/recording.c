/* recording.c - WAV and FLAC through libsndfile, CSV by hand. */
#include "recording.h"

#include <math.h>
#include <sndfile.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>

static int container_format(const char *container, int bits)
{
    int sub = bits == 16   ? SF_FORMAT_PCM_16
              : bits == 24 ? SF_FORMAT_PCM_24
              : bits == 32 ? SF_FORMAT_PCM_32
                           : SF_FORMAT_FLOAT;
    int type = !strcmp(container, "flac")   ? SF_FORMAT_FLAC
               : !strcmp(container, "rf64") ? SF_FORMAT_RF64
                                            : SF_FORMAT_WAV;
    return type | sub;
}

/* A sample of `bits` at the top of an int, as libsndfile takes it. */
static int quantised(double volts, int bits, double full_scale)
{
    double steps = ldexp(1, bits - 1), x = nearbyint(volts / full_scale * steps);
    x = fmax(-steps, fmin(steps - 1, x));
    return (int)ldexp(x, 32 - bits);
}

static sf_count_t write_frame(SNDFILE *file, const double *x, size_t columns, int bits,
                              double full_scale)
{
    int whole[RECORDING_COLUMNS];
    float real[RECORDING_COLUMNS];
    for (size_t k = 0; k < columns; k++) {
        if (bits)
            whole[k] = quantised(x[k], bits, full_scale);
        else
            real[k] = (float)(x[k] / full_scale);
    }
    return bits ? sf_writef_int(file, whole, 1) : sf_writef_float(file, real, 1);
}

int recording_sound(const char *path, const struct recording *recording, const char *container,
                    int bits, double full_scale)
{
    SF_INFO info = {.samplerate = (int)lround(recording->rate_hz),
                    .channels = (int)recording->columns,
                    .format = container_format(container, bits)};
    SNDFILE *file = sf_open(path, SFM_WRITE, &info);
    if (!file)
        return -1;
    /* the peak chunk of float files holds the time of day: same spec, same bytes */
    sf_command(file, SFC_SET_ADD_PEAK_CHUNK, NULL, SF_FALSE);
    int bad = 0;
    for (size_t i = 0; i < recording->frames && !bad; i++)
        bad = write_frame(file, recording->data + i * recording->columns, recording->columns, bits,
                          full_scale) != 1;
    if (sf_close(file))
        bad = 1;
    return bad ? -1 : 0;
}

static void number(FILE *file, double x, int digits, char decimal)
{
    char text[64];
    snprintf(text, sizeof text, "%.*f", digits, x);
    char *point = strchr(text, '.');
    if (point)
        *point = decimal;
    fputs(text, file);
}

static void row(FILE *file, const char *first, const char *const *cells, size_t n,
                const struct recording_csv *csv)
{
    const char *quote = csv->quoted ? "\"" : "";
    if (csv->time_name)
        fprintf(file, "%s%s%s%c", quote, first, quote, csv->separator);
    for (size_t k = 0; k < n; k++) {
        fprintf(file, "%s%s%s", quote, cells[k], quote);
        if (k + 1 < n)
            fputc(csv->separator, file);
    }
    fputs(csv->crlf ? "\r\n" : "\n", file);
}

int recording_text(const char *path, const struct recording *recording,
                   const struct recording_csv *csv)
{
    FILE *file = fopen(path, "wb");
    if (!file)
        return -1;
    if (csv->bom)
        fputs("\xef\xbb\xbf", file);
    for (int i = 0; i < csv->preamble; i++)
        fprintf(file, "Logger export, line %d%s", i + 1, csv->crlf ? "\r\n" : "\n");
    if (csv->names[0])
        row(file, csv->time_name, csv->names, recording->columns, csv);
    if (csv->units[0])
        row(file, "s", csv->units, recording->columns, csv);
    for (size_t i = 0; i < recording->frames; i++) {
        if (csv->time_name) {
            number(file, (double)i / recording->rate_hz, csv->time_digits, csv->decimal);
            fputc(csv->separator, file);
        }
        for (size_t k = 0; k < recording->columns; k++) {
            number(file, recording->data[i * recording->columns + k], csv->digits[k], csv->decimal);
            if (k + 1 < recording->columns)
                fputc(csv->separator, file);
        }
        fputs(csv->crlf ? "\r\n" : "\n", file);
    }
    int bad = ferror(file);
    if (fclose(file))
        bad = 1;
    return bad ? -1 : 0;
}
