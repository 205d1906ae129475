#include "read/csv_layout.h"

#include <csv.h>
#include <stdint.h>
#include <stdlib.h>
#include <string.h>

#include "read/csv_words.h"
#include "read/decimal.h"
#include "read/even.h"

#define ROWS_MOST 2048   /* lines of the head that are looked at */
#define WIDTH_MOST 1024u /* columns */

struct row { /* a line that is not empty, and how one pair of separator and decimal reads it */
    size_t offset, length;
    long line;
    size_t width;   /* cells up to the last that is not empty */
    size_t numbers; /* cells that are numbers */
    bool marked;    /* some number has a decimal mark or an exponent */
    bool numeric;   /* it may be a row of data */
};

struct head { /* the first lines */
    const char *text;
    struct row *rows; /* owned */
    size_t count;
    const char *path;
    bool loose; /* half of a row's cells may be words: a clock, a remark */
};

struct guess { /* one way to read them */
    char separator, decimal;
    size_t width; /* 0: the head cannot be read so */
    size_t start; /* row where the data begin */
    size_t fits;  /* rows of data that are all numbers */
    bool marked;  /* decimal marks among them */
};

/* ---- lines ---- */

static bool is_empty(const char *text, size_t length)
{
    for (size_t i = 0; i < length; i++)
        if (!strchr(" \t;,\r", text[i]))
            return false;
    return true;
}

static void find_lines(struct head *head, size_t length, bool whole, int skip)
{
    const char *text = head->text;
    const char bom[] = "\xEF\xBB\xBF";
    size_t at = length >= 3 && memcmp(text, bom, 3) == 0 ? 3 : 0;
    for (long line = 1; at < length && head->count < ROWS_MOST; line++) {
        const char *end = memchr(text + at, '\n', length - at);
        if (!end && !whole)
            break;
        const size_t size = end ? (size_t)(end - text) - at : length - at;
        if (line > skip && !is_empty(text + at, size))
            head->rows[head->count++] = (struct row){.offset = at, .length = size, .line = line};
        at += size + 1;
    }
}

/* ---- one way to read them ---- */

struct look {
    struct row *row;
    size_t column;
    char decimal;
};

static void look_at_cell(void *cell, size_t length, void *data)
{
    struct look *look = data;
    const char *text = cell;
    double value;
    look->column++;
    if (length == 0)
        return;
    look->row->width = look->column;
    if (decimal_parse(text, length, look->decimal, &value) != DECIMAL_NOT_A_NUMBER) {
        look->row->numbers++;
        for (size_t i = 0; i < length; i++)
            if (text[i] == look->decimal || text[i] == 'e' || text[i] == 'E')
                look->row->marked = true;
    } else if (csv_words_is_not_finite(text, length)) {
        look->row->numbers++;
    }
}

static int look_at_rows(struct head *head, char separator, char decimal)
{
    struct csv_parser parser;
    if (csv_init(&parser, 0) != 0)
        return -1;
    csv_set_delim(&parser, (unsigned char)separator);
    for (size_t i = 0; i < head->count; i++) {
        struct row *row = &head->rows[i];
        struct look look = {.row = row, .decimal = decimal};
        row->width = row->numbers = 0;
        row->marked = false;
        csv_parse(&parser, head->text + row->offset, row->length, look_at_cell, NULL, &look);
        csv_fini(&parser, look_at_cell, NULL, &look);
        row->numeric = row->numbers > 0 &&
                       (head->loose ? 2 * row->numbers >= row->width : row->numbers == row->width);
    }
    csv_free(&parser);
    return 0;
}

static bool is_data(const struct row *row, size_t width)
{
    return row->numeric && row->width == width;
}

/* The width that most rows of numbers have; 0: there are none. */
static size_t usual_width(const struct head *head)
{
    unsigned counts[WIDTH_MOST + 1] = {0};
    size_t best = 0;
    for (size_t i = 0; i < head->count; i++)
        if (head->rows[i].numeric && head->rows[i].width <= WIDTH_MOST)
            counts[head->rows[i].width]++;
    for (size_t w = 1; w <= WIDTH_MOST; w++)
        if (counts[w] > counts[best])
            best = w;
    return best;
}

/* A row right above the data that looks like a damaged row of data must not pass for a header. */
static size_t take_damaged(const struct head *head, size_t start, size_t width)
{
    const struct row *rows = head->rows;
    while (start > 0) {
        const struct row *above = &rows[start - 1];
        const struct row *second = start > 1 ? &rows[start - 2] : NULL;
        const bool is_text = second && second->width == width && second->numbers == 0;
        if (above->numeric)
            start -= 1;
        else if (second && is_data(second, width))
            start -= 2;
        else if (above->width == width && 2 * above->numbers >= width && is_text)
            start -= 1;
        else
            break;
    }
    return start;
}

/* Returns 0, or -1 when memory is out. */
static int try(struct head *head, char separator, char decimal, struct guess *guess)
{
    *guess = (struct guess){.separator = separator, .decimal = decimal};
    if (look_at_rows(head, separator, decimal) != 0)
        return -1;
    const struct row *rows = head->rows;
    const size_t width = usual_width(head);
    size_t start = 0;
    while (start < head->count && !(is_data(&rows[start], width) &&
                                    (start + 1 == head->count || is_data(&rows[start + 1], width))))
        start++;
    if (width == 0 || start == head->count)
        return 0;
    for (size_t i = start; i < head->count; i++) {
        guess->fits += is_data(&rows[i], width);
        guess->marked = guess->marked || (is_data(&rows[i], width) && rows[i].marked);
    }
    if (2 * guess->fits < head->count - start) /* most of what follows must be data */
        return 0;
    guess->width = width;
    guess->start = take_damaged(head, start, width);
    return 0;
}

/* ---- which way ---- */

/* Commas between whole numbers may be decimal commas. A header of as many names tells, or a point.
 * The head was last looked at with the comma as separator. */
static bool is_ambiguous(const struct head *head, const struct guess *guess)
{
    if (guess->marked || guess->width < 2)
        return false;
    if (guess->start == 0)
        return true;
    const struct row *above = &head->rows[guess->start - 1];
    return above->width != guess->width || above->numbers > 0;
}

static bool better(const struct guess *a, const struct guess *b)
{
    const bool a_wide = a->width > 1, b_wide = b->width > 1;
    if (a_wide != b_wide)
        return a_wide;
    return a->width > 0 && a->fits > b->fits;
}

/* 0; -1: no memory; -2: ambiguous. */
static int choose(struct head *head, const struct csv_wish *wish, struct guess *best)
{
    static const char separators[] = {';', '\t', ','}, decimals[] = {'.', ','};
    *best = (struct guess){0};
    bool ambiguous = false;
    for (size_t s = 0; s < 3; s++)
        for (size_t d = 0; d < 2; d++) {
            struct guess guess;
            if (wish->separator && wish->separator != separators[s])
                continue;
            if (wish->decimal && wish->decimal != decimals[d])
                continue;
            if (try(head, separators[s], decimals[d], &guess) != 0)
                return -1;
            const bool commas = separators[s] == ',';
            if (commas && decimals[d] == ',' && !guess.marked && !wish->separator)
                continue; /* decimal commas between separating commas stand in quotes, or not at all
                           */
            if (!better(&guess, best))
                continue;
            *best = guess;
            ambiguous = commas && !wish->separator && wish->decimal != '.' && decimals[d] == '.' &&
                        is_ambiguous(head, &guess);
        }
    return ambiguous ? -2 : 0;
}

/* ---- names ---- */

struct take { /* copies the cells of a row */
    char **cells;
    size_t column, width;
    bool failed;
};

static void take_cell(void *cell, size_t length, void *data)
{
    struct take *take = data;
    if (take->column >= take->width)
        return;
    char *copy = malloc(length + 1);
    if (copy) {
        memcpy(copy, cell, length);
        copy[length] = '\0';
    }
    take->failed = take->failed || !copy;
    take->cells[take->column++] = copy;
}

static int take_row(const struct head *head, const struct row *row, char separator, char **cells,
                    size_t width)
{
    struct csv_parser parser;
    struct take take = {.cells = cells, .width = width};
    if (csv_init(&parser, 0) != 0)
        return -1;
    csv_set_delim(&parser, (unsigned char)separator);
    csv_parse(&parser, head->text + row->offset, row->length, take_cell, NULL, &take);
    csv_fini(&parser, take_cell, NULL, &take);
    csv_free(&parser);
    while (take.column < width && !take.failed)
        take_cell((void *)"", 0, &take);
    return take.failed ? -1 : 0;
}

/* How many rows of text right above the data are names and units: 0 to 2. */
static size_t count_name_rows(const struct head *head, const struct guess *guess)
{
    if (guess->start == 0)
        return 0;
    const struct row *first = &head->rows[guess->start - 1];
    const struct row *second = guess->start > 1 ? &head->rows[guess->start - 2] : NULL;
    const bool both = second && second->width == guess->width;
    if (first->width > guess->width || (first->width < guess->width && !both))
        return 0;
    return both ? 2 : 1;
}

static int take_names(struct csv_layout *layout, struct head *head, const struct guess *guess)
{
    if (look_at_rows(head, guess->separator, guess->decimal) != 0)
        return -1;
    const size_t rows = count_name_rows(head, guess);
    layout->names = calloc(CSV_NAME_ROWS * layout->width, sizeof *layout->names);
    if (!layout->names)
        return -1;
    layout->name_rows = rows;
    for (size_t r = 0; r < rows; r++)
        if (take_row(head, &head->rows[guess->start - rows + r], guess->separator,
                     layout->names + r * layout->width, layout->width) != 0)
            return -1;
    return 0;
}

int csv_layout_column(const struct csv_layout *layout, const char *name)
{
    int found = -1;
    for (int exact = 1; exact >= 0 && found == -1 && *name; exact--)
        for (size_t c = 0; c < layout->width; c++) {
            bool match = false;
            for (size_t r = 0; r < layout->name_rows; r++)
                match = match ||
                        csv_words_match(layout->names[r * layout->width + c], name, exact != 0);
            if (match)
                found = found == -1 ? (int)c : -2;
        }
    return found;
}

/* ---- time ---- */

struct first_cell {
    char text[64];
    size_t length, column;
};

static void take_first(void *cell, size_t length, void *data)
{
    struct first_cell *first = data;
    if (first->column++ == 0 && length < sizeof first->text) {
        memcpy(first->text, cell, length);
        first->length = length;
    }
}

static struct first_cell first_cell(struct csv_parser *parser, const struct head *head,
                                    const struct row *row)
{
    struct first_cell first = {.length = 0};
    csv_parse(parser, head->text + row->offset, row->length, take_first, NULL, &first);
    csv_fini(parser, take_first, NULL, &first);
    return first;
}

/* Reads the first column of the data in the head as an even, rising row of times. A count in steps
 * of 1 is the number of the sample, not its time. */
static bool rises_evenly(const struct head *head, const struct guess *guess)
{
    const size_t rows = head->count - guess->start;
    struct csv_parser parser;
    if (rows < 3 || csv_init(&parser, 0) != 0)
        return false;
    csv_set_delim(&parser, (unsigned char)guess->separator);
    const struct first_cell a = first_cell(&parser, head, &head->rows[guess->start]);
    const struct first_cell b = first_cell(&parser, head, &head->rows[head->count - 1]);
    double first, last, before = 0;
    bool even = decimal_parse(a.text, a.length, guess->decimal, &first) == DECIMAL_DONE &&
                decimal_parse(b.text, b.length, guess->decimal, &last) == DECIMAL_DONE &&
                last > first && last - first != (double)(rows - 1);
    struct even grid;
    if (even)
        even_init(&grid, first, last, (long long)rows, 1,
                  decimal_grain(a.text, a.length, guess->decimal),
                  decimal_grain(b.text, b.length, guess->decimal));
    for (size_t i = 0; even && i < rows; i++) {
        const struct first_cell c = first_cell(&parser, head, &head->rows[guess->start + i]);
        double time = 0;
        even = decimal_parse(c.text, c.length, guess->decimal, &time) == DECIMAL_DONE &&
               (i == 0 || time > before) &&
               even_next(&grid, time, decimal_grain(c.text, c.length, guess->decimal)) == EVEN_DONE;
        before = time;
    }
    csv_free(&parser);
    return even;
}

/* Index of the time column; -1: none. */
static int find_time(const struct csv_layout *layout, const struct head *head,
                     const struct guess *guess, bool first_is_channel)
{
    for (size_t c = 0; c < layout->width; c++)
        for (size_t r = 0; r < layout->name_rows; r++)
            if (csv_words_is_time(layout->names[r * layout->width + c]))
                return (int)c;
    return !first_is_channel && layout->width > 1 && rises_evenly(head, guess) ? 0 : -1;
}

/* The time column that the sheet names. */
static int named_time(const struct csv_layout *layout, const char *name, const char *path,
                      struct fault *fault)
{
    char *end;
    const long number = strtol(name, &end, 10);
    if (*end == '\0' && number >= 1 && number <= (long)layout->width)
        return (int)number - 1;
    const int column = csv_layout_column(layout, name);
    if (column < 0)
        fault_set(fault, STATUS_RECORDING, "%s the time column's name, '%s': '%s'",
                  column == -2 ? "several columns have" : "no column has", name, path);
    return column;
}

static int set_time(struct csv_layout *layout, const struct head *head, const struct guess *guess,
                    const struct csv_wish *wish, struct fault *fault)
{
    const char *name = wish->time_column ? wish->time_column : "";
    if (!strcmp(name, "none"))
        return STATUS_DONE;
    const int column = *name ? named_time(layout, name, head->path, fault)
                             : find_time(layout, head, guess, wish->first_is_channel);
    if (fault->status != STATUS_DONE || column < 0)
        return fault->status;
    layout->has_time = true;
    layout->time_column = (size_t)column;
    layout->time_si = 0;
    for (size_t r = 0; r < layout->name_rows && layout->time_si == 0; r++)
        layout->time_si = csv_words_header_unit(layout->names[r * layout->width + (size_t)column]);
    const char *unit = layout->name_rows > 0
                           ? layout->names[(layout->name_rows - 1) * layout->width + (size_t)column]
                           : "";
    if (layout->time_si == 0 && layout->name_rows == 2 && !csv_words_is_time(unit))
        layout->time_si = csv_words_time_unit(unit);
    if (layout->time_si < 0)
        return fault_set(fault, STATUS_RECORDING,
                         "the unit of the time column is not known, '%s': '%s'", unit, head->path);
    if (layout->time_si == 0)
        layout->time_si = 1;
    return STATUS_DONE;
}

/* ---- all of it ---- */

static int check_text(const char *text, size_t length, const char *path, struct fault *fault)
{
    if (length >= 2 && (memcmp(text, "\xFF\xFE", 2) == 0 || memcmp(text, "\xFE\xFF", 2) == 0))
        return fault_set(fault, STATUS_RECORDING, "the text is UTF-16, save it as UTF-8: '%s'",
                         path);
    if (!memchr(text, '\n', length) && memchr(text, '\r', length))
        return fault_set(fault, STATUS_RECORDING,
                         "lines end with a bare carriage return, save them with newlines: '%s'",
                         path);
    return STATUS_DONE;
}

static int fill(struct csv_layout *layout, struct head *head, const struct csv_wish *wish,
                struct fault *fault)
{
    struct guess guess;
    int chosen = choose(head, wish, &guess);
    if (chosen == 0 && guess.width == 0) {
        head->loose = true;
        chosen = choose(head, wish, &guess);
    }
    if (chosen == -1)
        return fault_no_memory(fault);
    if (chosen == -2)
        return fault_set(fault, STATUS_RECORDING,
                         "commas may separate columns or decimals, state separator and decimal in "
                         "the sheet: '%s' (line %ld)",
                         head->path, head->rows[guess.start].line);
    if (guess.width == 0)
        return fault_set(fault, STATUS_RECORDING,
                         "neither a sound file nor rows of numbers: '%s'%s", head->path,
                         wish->separator || wish->decimal || wish->skip >= 0
                             ? " (separator, decimal and skip as in the sheet)"
                             : "");
    layout->separator = guess.separator;
    layout->decimal = guess.decimal;
    layout->width = guess.width;
    layout->data_offset = head->rows[guess.start].offset;
    layout->data_line = head->rows[guess.start].line;
    if (take_names(layout, head, &guess) != 0)
        return fault_no_memory(fault);
    return set_time(layout, head, &guess, wish, fault);
}

int csv_layout_find(struct csv_layout *layout, const char *text, size_t length, bool whole,
                    const struct csv_wish *wish, const char *path, struct fault *fault)
{
    *layout = (struct csv_layout){.width = 0};
    if (check_text(text, length, path, fault) != STATUS_DONE)
        return fault->status;
    struct head head = {.text = text, .path = path};
    head.rows = calloc(ROWS_MOST, sizeof *head.rows);
    if (!head.rows)
        return fault_no_memory(fault);
    find_lines(&head, length, whole, wish->skip);
    fill(layout, &head, wish, fault);
    free(head.rows);
    return fault->status;
}

void csv_layout_release(struct csv_layout *layout)
{
    for (size_t i = 0; layout->names && i < CSV_NAME_ROWS * layout->width; i++)
        free(layout->names[i]);
    free(layout->names);
    layout->names = NULL;
}
