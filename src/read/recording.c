#include "read/recording.h"

#include <math.h>
#include <stdlib.h>
#include <string.h>

#include "read/audio.h"
#include "read/columns.h"
#include "read/csv_file.h"

#define BUFFER_SAMPLES 32768u /* 128 KiB of float: stays in the second-level cache */

/* Common practice, without a source. */
#define RATES_MOST 0.01 /* a rate that was rounded in the sheet passes, another rate does not */
#define COARSE 0.002    /* a relative error of the rate is one of the speed */

struct recording_source {
    bool text;
    struct audio audio;
    struct csv_file csv;
    size_t width, base; /* channels; channels of the files before it */
    double rate_hz;
    long long frames;
    struct columns_route *routes; /* from: channel of the sound file, or slot of the text */
    double *gains;                /* beside the routes */
    size_t route_count;
    size_t *columns; /* text: wanted columns by slot */
    size_t column_count;
    float *buffer; /* sound: BUFFER_SAMPLES, or one frame */
};

static int open_source(struct recording_source *source, const struct recording_wish *wish,
                       size_t index, struct fault *fault)
{
    const char *path = wish->paths[index];
    const struct digest *digest = wish->digests[index];
    source->text = digest->text;
    source->csv.fd = -1;
    if (source->text) {
        if (csv_file_open(&source->csv, path, &wish->csv, digest, fault) != STATUS_DONE)
            return fault->status;
        source->width = source->csv.layout.width;
        source->frames = source->csv.frames;
        source->rate_hz = source->csv.rate_hz;
        const double rate = wish->rate_hz;
        if (isnan(source->rate_hz) && isnan(rate))
            return fault_set(fault, STATUS_USAGE,
                             "no time column was found and the sheet gives no rate: '%s'", path);
        if (!isnan(source->rate_hz) && !isnan(rate) &&
            fabs(source->rate_hz / rate - 1) > RATES_MOST + source->csv.uncertainty)
            return fault_set(fault, STATUS_RECORDING,
                             "the time column gives a rate of %.6g Hz and the sheet %.6g Hz: '%s'",
                             source->rate_hz, rate, path);
        const bool coarse = source->csv.uncertainty > COARSE;
        if (coarse && isnan(rate))
            return fault_set(
                fault, STATUS_RECORDING,
                "the time column gives the rate to %.1g %% only, state the rate in the "
                "sheet: '%s'",
                100 * source->csv.uncertainty, path);
        if (isnan(source->rate_hz) || coarse)
            source->rate_hz = rate;
    } else {
        if (audio_open(&source->audio, path, fault) != STATUS_DONE)
            return fault->status;
        source->width = (size_t)source->audio.channels;
        source->frames = source->audio.frames;
        source->rate_hz = source->audio.rate_hz;
        const size_t room = source->width > BUFFER_SAMPLES ? source->width : BUFFER_SAMPLES;
        source->buffer = malloc(room * sizeof *source->buffer);
        if (!source->buffer)
            return fault_no_memory(fault);
    }
    return STATUS_DONE;
}

static int same_length_and_rate(const struct recording *recording, struct fault *fault)
{
    const struct recording_source *first = &recording->sources[0];
    char *const *paths = recording->wish->paths;
    for (size_t i = 1; i < recording->source_count; i++) {
        const struct recording_source *other = &recording->sources[i];
        /* rates out of time columns are rounded: half a sample over the whole length is no
         * difference */
        if (fabs(first->rate_hz - other->rate_hz) * (double)first->frames > 0.5 * first->rate_hz)
            return fault_set(
                fault, STATUS_RECORDING,
                "files of one run have different rates, %.9g Hz in '%s' and %.9g Hz in "
                "'%s'",
                first->rate_hz, paths[0], other->rate_hz, paths[i]);
        if (first->frames != other->frames)
            return fault_set(
                fault, STATUS_RECORDING,
                "files of one run have different lengths, %lld frames in '%s' and %lld "
                "in '%s'",
                first->frames, paths[0], other->frames, paths[i]);
    }
    return STATUS_DONE;
}

/* "12" gives 12; 0 where the text is no number from 1 to 999999. */
static size_t channel_number(const char *text)
{
    size_t number = 0, length = strspn(text, "0123456789");
    if (length == 0 || length > 6 || text[length])
        return 0;
    for (size_t i = 0; i < length; i++)
        number = number * 10 + (size_t)(text[i] - '0');
    return number;
}

static int find_number(const struct recording *recording, const struct recording_column *column,
                       size_t number, size_t *source, size_t *channel, struct fault *fault)
{
    const struct recording_source *s = recording->sources;
    for (size_t i = 0; i < recording->source_count; i++) {
        if (number > s[i].base + s[i].width)
            continue;
        *source = i;
        *channel = number - s[i].base - 1;
        const int named = s[i].text ? csv_layout_column(&s[i].csv.layout, column->channel) : -1;
        if (named >= 0 && (size_t)named != *channel)
            return fault_set(
                fault, STATUS_RECORDING,
                "channel %zu of '%s' may be column %zu or the one named so, column %d: "
                "'%s'",
                number, column->name, *channel + 1, named + 1, recording->wish->paths[i]);
        return STATUS_DONE;
    }
    const struct recording_source *last = &s[recording->source_count - 1];
    return fault_set(fault, STATUS_RECORDING,
                     "no channel %zu for '%s', the recording has %zu: '%s'", number, column->name,
                     last->base + last->width, recording->wish->paths[0]);
}

static int find_name(const struct recording *recording, const struct recording_column *column,
                     size_t *source, size_t *channel, struct fault *fault)
{
    int found = 0;
    for (size_t i = 0; i < recording->source_count; i++) {
        const struct recording_source *s = &recording->sources[i];
        const int at = s->text ? csv_layout_column(&s->csv.layout, column->channel) : -1;
        if (at == -1)
            continue;
        found += at == -2 ? 2 : 1;
        *source = i;
        *channel = at < 0 ? 0 : (size_t)at;
    }
    if (found == 1)
        return STATUS_DONE;
    return fault_set(fault, STATUS_RECORDING, "%s named '%s' for '%s': '%s'",
                     found ? "several columns are" : "no column is", column->channel, column->name,
                     recording->wish->paths[0]);
}

/* SI per value of the file, and |SI| at full scale. */
static int calibrate(const struct recording *recording, const struct recording_column *column,
                     size_t index, double *gain, double *rail, struct fault *fault)
{
    const struct recording_source *source = &recording->sources[index];
    const char *path = recording->wish->paths[index];
    const double full_scale = recording->wish->full_scale;
    *gain = column->si;
    *rail = NAN;
    if (source->text)
        return STATUS_DONE;
    if (column->volts && isnan(full_scale) && !column->plain)
        return fault_set(fault, STATUS_USAGE,
                         "add 'full scale = 10 V' under [recording] (volts at digital full "
                         "scale), sensor '%s' has a scale: '%s'",
                         column->name, path);
    if (!column->volts && source->audio.bits > 0 && !column->plain)
        return fault_set(fault, STATUS_USAGE,
                         "sensor '%s' has no scale and the recording holds whole numbers: '%s'",
                         column->name, path);
    if (column->volts && !isnan(full_scale))
        *gain *= full_scale;
    if (column->volts || source->audio.bits > 0)
        *rail = fabs((double)((float)source->audio.largest * (float)*gain));
    return STATUS_DONE;
}

static int add_route(struct recording_source *source, size_t channel, size_t to, double gain)
{
    size_t from = channel;
    if (source->text) {
        for (from = 0; from < source->column_count && source->columns[from] != channel; from++)
            ;
        if (from == source->column_count)
            source->columns[source->column_count++] = channel;
    }
    source->routes[source->route_count] = (struct columns_route){from, to, (float)gain};
    source->gains[source->route_count++] = gain;
    return STATUS_DONE;
}

static int find_columns(struct recording *recording, struct fault *fault)
{
    const struct recording_wish *wish = recording->wish;
    for (size_t c = 0; c < wish->column_count; c++) {
        const struct recording_column *column = &wish->columns[c];
        const size_t number = channel_number(column->channel);
        size_t index = 0, channel = 0;
        int status = number > 0 ? find_number(recording, column, number, &index, &channel, fault)
                                : find_name(recording, column, &index, &channel, fault);
        if (status != STATUS_DONE)
            return status;
        struct recording_source *source = &recording->sources[index];
        if (source->text && source->csv.layout.has_time &&
            source->csv.layout.time_column == channel)
            return fault_set(fault, STATUS_RECORDING,
                             "channel '%s' of '%s' is the time column: '%s'", column->channel,
                             column->name, wish->paths[index]);
        double gain;
        status = calibrate(recording, column, index, &gain, &recording->rails[c], fault);
        if (status != STATUS_DONE)
            return status;
        add_route(source, channel, c, gain);
    }
    return STATUS_DONE;
}

static int reserve(struct recording *recording, struct fault *fault)
{
    const size_t columns = recording->wish->column_count;
    size_t base = 0;
    for (size_t i = 0; i < recording->source_count; i++) {
        struct recording_source *source = &recording->sources[i];
        source->base = base;
        base += source->width;
        source->routes = calloc(columns, sizeof *source->routes);
        source->gains = calloc(columns, sizeof *source->gains);
        source->columns = calloc(columns, sizeof *source->columns);
        if (!source->routes || !source->gains || !source->columns)
            return fault_no_memory(fault);
    }
    return STATUS_DONE;
}

int recording_open(struct recording *recording, const struct recording_wish *wish,
                   struct fault *fault)
{
    *recording = (struct recording){.wish = wish, .column_count = wish->column_count};
    recording->rails = calloc(wish->column_count, sizeof *recording->rails);
    recording->sources = calloc(wish->path_count, sizeof *recording->sources);
    if (!recording->rails || !recording->sources)
        return fault_no_memory(fault);
    for (size_t i = 0; i < wish->path_count; i++) {
        recording->source_count = i + 1;
        if (open_source(&recording->sources[i], wish, i, fault) != STATUS_DONE)
            return fault->status;
    }
    if (same_length_and_rate(recording, fault) != STATUS_DONE ||
        reserve(recording, fault) != STATUS_DONE || find_columns(recording, fault) != STATUS_DONE)
        return fault->status;
    for (size_t i = 0; i < recording->source_count; i++) {
        struct recording_source *source = &recording->sources[i];
        if (source->text && csv_file_start(&source->csv, source->columns, source->column_count,
                                           fault) != STATUS_DONE)
            return fault->status;
    }
    recording->whole_numbers = true;
    for (size_t i = 0; i < recording->source_count; i++)
        if (recording->sources[i].text || recording->sources[i].audio.bits == 0)
            recording->whole_numbers = false;
    recording->rate_hz = recording->sources[0].rate_hz;
    recording->frames = recording->sources[0].frames;
    return STATUS_DONE;
}

static int read_audio(struct recording_source *source, float *samples, size_t out_width,
                      size_t frames, size_t *got, struct fault *fault)
{
    const size_t most = source->width > BUFFER_SAMPLES ? 1 : BUFFER_SAMPLES / source->width;
    size_t done = 0, part = 1;
    while (done < frames && part > 0) {
        const size_t ask = frames - done < most ? frames - done : most;
        if (audio_read(&source->audio, source->buffer, ask, &part, fault) != STATUS_DONE)
            return fault->status;
        columns_move(source->buffer, source->width, samples + done * out_width, out_width,
                     source->routes, source->route_count, part);
        done += part;
    }
    *got = done;
    return STATUS_DONE;
}

static int read_text(struct recording_source *source, float *samples, size_t out_width,
                     size_t frames, size_t *got, struct fault *fault)
{
    size_t done = 0, part = 1;
    while (part > 0) {
        const double *rows = NULL;
        if (csv_file_read(&source->csv, frames - done, &rows, &part, fault) != STATUS_DONE)
            return fault->status;
        columns_move_double(rows, source->column_count, samples + done * out_width, out_width,
                            source->routes, source->gains, source->route_count, part);
        done += part;
        if (done == frames && frames > 0)
            break;
    }
    *got = done;
    return STATUS_DONE;
}

static int unchanged(const struct recording *recording, struct fault *fault)
{
    const struct recording_wish *wish = recording->wish;
    for (size_t i = 0; i < recording->source_count; i++) {
        struct digest_mark mark;
        if (digest_mark(wish->paths[i], &mark, fault) != STATUS_DONE)
            return fault->status;
        if (!digest_mark_equal(&mark, &wish->digests[i]->mark))
            return fault_set(fault, STATUS_RECORDING,
                             "the recording changed while it was read: '%s'", wish->paths[i]);
    }
    return STATUS_DONE;
}

int recording_read(struct recording *recording, float *samples, size_t frames, size_t *got,
                   struct fault *fault)
{
    const size_t width = recording->column_count;
    *got = 0;
    for (size_t i = 0; i < recording->source_count; i++) {
        struct recording_source *source = &recording->sources[i];
        size_t part = 0;
        int status = source->text ? read_text(source, samples, width, frames, &part, fault)
                                  : read_audio(source, samples, width, frames, &part, fault);
        if (status != STATUS_DONE)
            return status;
        *got = part;
    }
    const size_t count = *got * width;
    const size_t bad = recording->whole_numbers ? count : columns_first_bad(samples, count);
    if (bad < count)
        return fault_set(fault, STATUS_RECORDING, "a value of '%s' is out of range: '%s'",
                         recording->wish->columns[bad % width].name, recording->wish->paths[0]);
    return *got > 0 ? STATUS_DONE : unchanged(recording, fault);
}

void recording_close(struct recording *recording)
{
    for (size_t i = recording->source_count; i-- > 0;) {
        struct recording_source *source = &recording->sources[i];
        free(source->buffer);
        free(source->columns);
        free(source->gains);
        free(source->routes);
        if (source->text)
            csv_file_close(&source->csv);
        else
            audio_close(&source->audio);
    }
    free(recording->sources);
    free(recording->rails);
    *recording = (struct recording){0};
}
