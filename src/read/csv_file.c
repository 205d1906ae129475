#include "read/csv_file.h"

#include <errno.h>
#include <fcntl.h>
#include <math.h>
#include <stdlib.h>
#include <string.h>
#include <unistd.h>

#include "read/decimal.h"
#include "read/even.h"
#include "read/lines.h"

#define HEAD_BYTES 65536u /* the preamble and some hundred rows */
#define LINE_MOST 65536u  /* a longer last line is no row of measurements */
#define LANES_LEAST                                                                                \
    (256 * 1024) /* bytes of text from which on a second thread is worth its start */

static int read_fault(const struct csv_file *file, struct fault *fault)
{
    return fault_set(fault, STATUS_RECORDING, "cannot read the recording: '%s'", file->path);
}

/* Up to `length` bytes from `offset` on; -1: a read error. */
static ssize_t read_at(int fd, char *bytes, size_t length, long long offset)
{
    size_t have = 0;
    while (have < length) {
        ssize_t got = pread(fd, bytes + have, length - have, (off_t)(offset + (long long)have));
        if (got < 0 && errno == EINTR)
            continue;
        if (got < 0)
            return -1;
        if (got == 0)
            break;
        have += (size_t)got;
    }
    return (ssize_t)have;
}

struct find { /* looks for one cell of a row */
    size_t column, wanted;
    char text[64];
    size_t length;
    bool found;
};

static void find_cell(void *cell, size_t length, void *data)
{
    struct find *find = data;
    if (find->column++ == find->wanted && length < sizeof find->text) {
        memcpy(find->text, cell, length);
        find->length = length;
        find->found = true;
    }
}

/* The time in a row, s. False: no number. */
static bool time_of(const struct csv_layout *layout, const char *row, size_t length, double *time,
                    struct decimal_grain *grain)
{
    struct find find = {.wanted = layout->time_column};
    struct csv_parser parser;
    if (csv_init(&parser, 0) != 0)
        return false;
    csv_set_delim(&parser, (unsigned char)layout->separator);
    csv_parse(&parser, row, length, find_cell, NULL, &find);
    csv_fini(&parser, find_cell, NULL, &find);
    csv_free(&parser);
    if (!find.found || decimal_parse(find.text, find.length, layout->decimal, time) != DECIMAL_DONE)
        return false;
    *time *= layout->time_si;
    *grain = decimal_grain(find.text, find.length, layout->decimal);
    return true;
}

/* Rate out of the first and the last time; the rows between are judged when they are read. */
static int measure_rate(struct csv_file *file, const char *head, size_t head_length,
                        const struct digest *digest, struct fault *fault)
{
    const struct csv_layout *layout = &file->layout;
    double first, last;
    struct decimal_grain first_grain, last_grain;
    if (digest->lines.last_length > LINE_MOST)
        return fault_set(fault, STATUS_RECORDING, "the last line is no row of data: '%s'",
                         file->path);
    const size_t length = (size_t)digest->lines.last_length;
    const ssize_t got = read_at(file->fd, file->chunk, length, digest->lines.last_offset);
    if (got != (ssize_t)length)
        return read_fault(file, fault);
    const char *row = head + layout->data_offset;
    const char *end = memchr(row, '\n', head_length - layout->data_offset);
    const size_t row_length = end ? (size_t)(end - row) : head_length - layout->data_offset;
    if (file->frames < 2)
        return fault_set(fault, STATUS_RECORDING, "the recording has only one row of data: '%s'",
                         file->path);
    if (!time_of(layout, row, row_length, &first, &first_grain))
        return fault_set(fault, STATUS_RECORDING, "the first row has no time: '%s' (line %ld)",
                         file->path, layout->data_line);
    if (!time_of(layout, file->chunk, length, &last, &last_grain))
        return fault_set(fault, STATUS_RECORDING, "the last row is cut short or has no time: '%s'",
                         file->path);
    if (!(last > first))
        return fault_set(fault, STATUS_RECORDING, "the time column does not advance: '%s'",
                         file->path);
    even_init(&file->even, first, last, file->frames, layout->time_si, first_grain, last_grain);
    file->rate_hz = (double)(file->frames - 1) / (last - first);
    file->uncertainty = even_uncertainty(&file->even);
    return STATUS_DONE;
}

static int examine(struct csv_file *file, const struct csv_wish *wish, const struct digest *digest,
                   char *head, struct fault *fault)
{
    const ssize_t length = read_at(file->fd, head, HEAD_BYTES, 0);
    if (length < 0)
        return read_fault(file, fault);
    const bool whole = length >= digest->mark.size;
    if (csv_layout_find(&file->layout, head, (size_t)length, whole, wish, file->path, fault) !=
        STATUS_DONE)
        return fault->status;
    struct lines before = LINES_INIT;
    lines_feed(&before, head, file->layout.data_offset);
    lines_finish(&before);
    file->frames = digest->lines.count - before.count;
    if (file->layout.has_time)
        return measure_rate(file, head, (size_t)length, digest, fault);
    return STATUS_DONE;
}

int csv_file_open(struct csv_file *file, const char *path, const struct csv_wish *wish,
                  const struct digest *digest, struct fault *fault)
{
    *file = (struct csv_file){.path = path, .fd = -1, .size = digest->mark.size, .rate_hz = NAN};
    char *head = malloc(HEAD_BYTES);
    file->chunk = malloc(LINE_MOST > CSV_ROWS_FEED_MOST ? LINE_MOST : CSV_ROWS_FEED_MOST);
    if (!head || !file->chunk) {
        free(head);
        return fault_no_memory(fault);
    }
    file->fd = open(path, O_RDONLY | O_CLOEXEC | O_NONBLOCK);
    if (file->fd < 0)
        fault_set(fault, STATUS_RECORDING, "cannot open the recording: '%s'", path);
    else
        examine(file, wish, digest, head, fault);
    free(head);
    return fault->status;
}

int csv_file_start(struct csv_file *file, const size_t *columns, size_t count, struct fault *fault)
{
    file->offset = file->fetched = (long long)file->layout.data_offset;
    file->ready = &file->rows;
    if (csv_rows_init(&file->rows, &file->layout, columns, count,
                      file->layout.has_time ? &file->even : NULL, file->path,
                      fault) == STATUS_DONE &&
        file->size - file->offset >= LANES_LEAST)
        file->lanes = csv_lanes_new(&file->layout, columns, count); /* without: slower, not wrong */
    return fault->status;
}

/* ---- the next rows, by the lanes ---- */

/* False where a time is not as it should be; then nothing has changed. */
static bool judge_times(struct csv_file *file, const struct csv_rows *rows)
{
    struct even even = file->even;
    for (size_t i = 0; i < rows->count && rows->times; i++)
        if (even_next(&even, rows->times[i] * rows->time_si, rows->grains[i]) != EVEN_DONE)
            return false;
    file->even = even;
    return true;
}

/* Until the parts are full or the text ends; what goes wrong is met again by who reads in one go.
 */
static void feed_lanes(struct csv_file *file)
{
    size_t room;
    char *text;
    while ((text = csv_lanes_room(file->lanes, &room))) {
        const ssize_t got = read_at(file->fd, text, room, file->fetched);
        if (got <= 0)
            break;
        file->fetched += got;
        if (!csv_lanes_fill(file->lanes, (size_t)got))
            break;
    }
}

/* False: from file->offset on the text must be read in one go. */
static bool advance_lanes(struct csv_file *file)
{
    struct csv_lanes_part part;
    if (file->ready != &file->rows)
        csv_lanes_drop(file->lanes);
    file->ready = &file->rows;
    feed_lanes(file);
    if (!csv_lanes_next(file->lanes, &part) || !part.clean || !judge_times(file, part.rows))
        return false;
    csv_rows_skip(&file->rows, part.lines);
    file->offset += (long long)part.length;
    file->ready = part.rows;
    return true;
}

/* ---- the next rows, in one go ---- */

/* Parses the next bytes. */
static int advance(struct csv_file *file, struct fault *fault)
{
    file->taken = 0;
    if (file->lanes && advance_lanes(file))
        return STATUS_DONE;
    csv_lanes_free(file->lanes);
    file->lanes = NULL;
    const ssize_t got = read_at(file->fd, file->chunk, CSV_ROWS_FEED_MOST, file->offset);
    if (got < 0)
        return read_fault(file, fault);
    file->offset += got;
    if (got > 0)
        return csv_rows_feed(&file->rows, file->chunk, (size_t)got);
    file->ended = true;
    return csv_rows_finish(&file->rows);
}

int csv_file_read(struct csv_file *file, size_t frames, const double **rows, size_t *got,
                  struct fault *fault)
{
    *got = 0;
    while (file->taken == file->ready->count && !file->ended)
        if (advance(file, fault) != STATUS_DONE)
            return fault->status;
    const size_t ready = file->ready->count - file->taken;
    *got = ready < frames ? ready : frames;
    *rows = file->ready->values + file->taken * file->ready->slots;
    file->taken += *got;
    file->done += (long long)*got;
    if (file->done > file->frames || (*got == 0 && file->done < file->frames))
        return fault_set(fault, STATUS_RECORDING,
                         "the text has %lld lines of data but %s rows, a cell may run over several "
                         "lines: '%s'",
                         file->frames, file->done > file->frames ? "more" : "fewer", file->path);
    return STATUS_DONE;
}

void csv_file_close(struct csv_file *file)
{
    csv_lanes_free(file->lanes);
    file->lanes = NULL;
    csv_rows_release(&file->rows);
    csv_layout_release(&file->layout);
    free(file->chunk);
    file->chunk = NULL;
    if (file->fd >= 0)
        close(file->fd);
    file->fd = -1;
}
