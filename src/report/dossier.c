#include "report/dossier.h"

#include <math.h>
#include <stdlib.h>
#include <string.h>

#include "base/status.h"

void dossier_init(struct dossier *dossier, const struct job *job)
{
    memset(dossier, 0, sizeof *dossier);
    dossier->job = job;
}

void dossier_release(struct dossier *dossier)
{
    for (size_t i = 0; i < dossier->runs.count; i++)
        run_release(&dossier->runs.items[i].record);
    for (size_t i = 0; i < dossier->turns.count; i++)
        turns_release(&dossier->turns.items[i]);
    for (size_t i = 0; i < dossier->spectra.count; i++)
        spectrum_release(&dossier->spectra.items[i]);
    for (size_t i = 0; i < dossier->curves.count; i++)
        curve_release(&dossier->curves.items[i]);
    free(dossier->runs.items);
    free(dossier->readings.items);
    free(dossier->tachos.items);
    free(dossier->turns.items);
    free(dossier->spectra.items);
    free(dossier->curves.items);
    free(dossier->vetted.items);
    free(dossier->findings.items);
    free(dossier->responses.items);
    free(dossier->corrections.items);
    free(dossier->placements.items);
    free(dossier->forecasts.items);
    free(dossier->residuals.items);
    free(dossier->parts.items);
    free(dossier->zones.items);
    free(dossier->compared.items);
    free(dossier->lines.items);
    buffer_release(&dossier->text);
    json_decref(dossier->figures);
    dossier_init(dossier, NULL);
}

/* A cleared slot at the end of a list; it counts only once its `count` is raised. NULL: no memory.
 */
static void *slot(void **items, size_t count, size_t *room, size_t size)
{
    if (count == *room) {
        size_t more = *room ? 2 * *room : 16;
        void *grown = realloc(*items, more * size);
        if (!grown)
            return NULL;
        *items = grown;
        *room = more;
    }
    void *place = (char *)*items + count * size;
    memset(place, 0, size);
    return place;
}
#define SLOT(list) slot((void **)&(list).items, (list).count, &(list).room, sizeof *(list).items)

/* Most records are parsed straight into their list. */
#define ADD(list, record, call)                                                                    \
    do {                                                                                           \
        record = SLOT(list);                                                                       \
        if (!record)                                                                               \
            return -2;                                                                             \
        int result = (call);                                                                       \
        if (result == 0)                                                                           \
            (list).count++;                                                                        \
        return result;                                                                             \
    } while (0)

static int add_run(struct dossier *d, const json_t *json, const char **why)
{
    struct dossier_run *item = SLOT(d->runs);
    if (!item)
        return -2;
    int result = run_parse(&item->record, d->job, json, why);
    if (result == 0)
        item->arrival = d->runs.count++;
    return result;
}

static int add_reading(struct dossier *d, const json_t *json, const char **why)
{
    struct dossier_reading *item = SLOT(d->readings);
    if (!item)
        return -2;
    item->use = true;
    int result = reading_parse(&item->reading, d->job, json, why);
    if (result == 0)
        item->arrival = d->readings.count++;
    return result;
}

static int add_tacho(struct dossier *d, const json_t *json, const char **why)
{
    struct tacho_record *r;
    ADD(d->tachos, r, tacho_parse(r, json, why));
}

static int add_channel(struct dossier *d, const json_t *json, const char **why)
{
    struct channel_record unused;
    return channel_parse(&unused, d->job, json, why);
}

static int add_turns(struct dossier *d, const json_t *json, const char **why)
{
    struct turns_record *r;
    if (!d->keep_traces)
        return 0;
    ADD(d->turns, r, turns_parse(r, d->job, json, why));
}

static int add_spectrum(struct dossier *d, const json_t *json, const char **why)
{
    struct spectrum_record *r;
    if (!d->keep_traces || (d->sparse && dossier_is_audit(d)))
        return 0;
    ADD(d->spectra, r, spectrum_parse(r, d->job, json, why));
}

static int add_curve(struct dossier *d, const json_t *json, const char **why)
{
    struct curve_record *r;
    if (!d->keep_traces)
        return 0;
    ADD(d->curves, r, curve_parse(r, d->job, json, why));
}

static int add_vetted(struct dossier *d, const json_t *json, const char **why)
{
    struct vetted_record *r;
    ADD(d->vetted, r, vetted_parse(r, d->job, json, why));
}

static int add_finding(struct dossier *d, const json_t *json, const char **why)
{
    struct finding_record *r = SLOT(d->findings);
    if (!r)
        return -2;
    int result = finding_parse(r, d->job, json, why);
    if (result != 0)
        return result;
    /* One without a figure may be one that could not be made: it is told. */
    if (d->sparse && dossier_is_audit(d) && r->verdict == VERDICT_OK && isfinite(r->value))
        d->counted++;
    else
        d->findings.count++;
    return 0;
}

static int add_response(struct dossier *d, const json_t *json, const char **why)
{
    struct response_record *r;
    ADD(d->responses, r, response_parse(r, d->job, json, why));
}

static int add_correction(struct dossier *d, const json_t *json, const char **why)
{
    struct correction_record *r;
    ADD(d->corrections, r, correction_parse(r, d->job, json, why));
}

static int add_placement(struct dossier *d, const json_t *json, const char **why)
{
    struct placement_record *r;
    ADD(d->placements, r, placement_parse(r, d->job, json, why));
}

static int add_forecast(struct dossier *d, const json_t *json, const char **why)
{
    struct forecast_record *r;
    ADD(d->forecasts, r, forecast_parse(r, d->job, json, why));
}

static int add_residual(struct dossier *d, const json_t *json, const char **why)
{
    struct residual_record *r;
    ADD(d->residuals, r, residual_parse(r, d->job, json, why));
}

static int add_parts(struct dossier *d, const json_t *json, const char **why)
{
    struct parts_record *r;
    ADD(d->parts, r, parts_parse(r, d->job, json, why));
}

static int add_zone(struct dossier *d, const json_t *json, const char **why)
{
    struct zone_record *r;
    ADD(d->zones, r, zone_parse(r, d->job, json, why));
}

static int add_compared(struct dossier *d, const json_t *json, const char **why)
{
    struct compared_record *r;
    ADD(d->compared, r, compared_parse(r, d->job, json, why));
}

static int add_next(struct dossier *d, const json_t *json, const char **why)
{
    int result = next_parse(&d->next, json, why);
    if (result != 0)
        return result;
    json_decref(d->figures);
    d->figures = json_deep_copy(json);
    d->has_next = true;
    return d->figures ? 0 : -2;
}

static int add_line(struct dossier *d, const char *bytes, size_t length)
{
    struct dossier_line *line = SLOT(d->lines);
    if (!line)
        return -2;
    while (length > 0 && (bytes[length - 1] == '\n' || bytes[length - 1] == '\r'))
        length--;
    buffer_add(&d->text, ",\n", 2);
    *line = (struct dossier_line){d->text.length, length};
    buffer_add(&d->text, bytes, length);
    d->lines.count++;
    return d->text.failed ? -2 : 0;
}

int dossier_add(struct dossier *dossier, const json_t *json, const char *bytes, size_t length,
                const char **why)
{
    static const struct {
        const char *kind;
        int (*add)(struct dossier *, const json_t *, const char **);
    } kinds[] = {
        {"run", add_run},
        {"reading", add_reading},
        {"tacho", add_tacho},
        {"channel", add_channel},
        {"turns", add_turns},
        {"spectrum", add_spectrum},
        {"curve", add_curve},
        {"vetted", add_vetted},
        {"finding", add_finding},
        {"response", add_response},
        {"correction", add_correction},
        {"placement", add_placement},
        {"forecast", add_forecast},
        {"residual", add_residual},
        {"next", add_next},
        {"parts", add_parts},
        {"zone", add_zone},
        {"compared", add_compared},
    };
    const char *kind = json_string_value(json_object_get(json, "kind"));
    if (!kind) {
        *why = "no kind";
        return -1;
    }
    if (dossier->keep_lines && add_line(dossier, bytes, length) != 0)
        return -2;
    for (size_t i = 0; i < sizeof kinds / sizeof *kinds; i++) {
        if (strcmp(kind, kinds[i].kind) == 0)
            return kinds[i].add(dossier, json, why);
    }
    return 0;
}

/* Rank of a run: the sheet's order, behind it the order of arrival. */
static size_t rank(const struct dossier *d, const char *run, size_t arrival)
{
    int index = job_find_run(d->job, run);
    return index >= 0 ? (size_t)index : d->job->run_count + arrival;
}

static int compare_size(size_t a, size_t b)
{
    return a < b ? -1 : a > b;
}

static int compare_runs(const void *a, const void *b)
{
    const struct dossier_run *x = a, *y = b;
    return compare_size(x->arrival, y->arrival);
}

static int compare_readings(const void *a, const void *b)
{
    const struct dossier_reading *x = a, *y = b;
    int order = compare_size(x->run, y->run);
    return order ? order : compare_size(x->arrival, y->arrival);
}

static void judge(struct dossier *d, const struct vetted_record *vetted)
{
    for (size_t i = 0; i < d->readings.count; i++) {
        struct dossier_reading *item = &d->readings.items[i];
        if (!vetted_is_of(vetted, &item->reading))
            continue;
        item->judged = true;
        item->use = item->use && vetted->use;
        memcpy(item->widen, vetted->widen, sizeof item->widen);
    }
}

/* What the regression refused is used no more than what vet did: of one sensor, or of all of a run.
 */
static void refuse(struct dossier *d, const struct finding_record *f)
{
    if (f->verdict != VERDICT_REFUSE || strcmp(f->stage, "solve") != 0 ||
        strcmp(f->check, "linearity") != 0 || !f->run[0])
        return;
    for (size_t i = 0; i < d->readings.count; i++) {
        struct dossier_reading *item = &d->readings.items[i];
        if (strcmp(item->reading.run, f->run) == 0 &&
            (f->sensor < 0 || f->sensor == item->reading.sensor))
            item->use = false;
    }
}

void dossier_close(struct dossier *dossier)
{
    struct dossier *d = dossier;
    for (size_t i = 0; i < d->vetted.count; i++)
        judge(d, &d->vetted.items[i]);
    for (size_t i = 0; i < d->findings.count; i++)
        refuse(d, &d->findings.items[i]);
    for (size_t i = 0; i < d->runs.count; i++) {
        struct dossier_run *run = &d->runs.items[i];
        run->arrival = rank(d, run->record.run, run->arrival);
    }
    if (d->runs.count > 1)
        qsort(d->runs.items, d->runs.count, sizeof *d->runs.items, compare_runs);
    for (size_t i = 0; i < d->readings.count; i++) {
        struct dossier_reading *item = &d->readings.items[i];
        item->run = d->runs.count;
        for (size_t r = 0; r < d->runs.count; r++) {
            if (strcmp(d->runs.items[r].record.run, item->reading.run) == 0)
                item->run = r;
        }
    }
    if (d->readings.count > 1)
        qsort(d->readings.items, d->readings.count, sizeof *d->readings.items, compare_readings);
}

void dossier_cov(const struct dossier_reading *reading, double cov[3])
{
    for (int i = 0; i < 3; i++)
        cov[i] = reading->reading.cov[i] + reading->widen[i];
}

bool dossier_is_audit(const struct dossier *dossier)
{
    return dossier->job->audit;
}

int dossier_base(const struct job *job, const char *relative_to)
{
    return strcmp(relative_to, "as found") == 0 ? -1 : job_find_run(job, relative_to);
}

double dossier_speed(const struct dossier *dossier, const char *run)
{
    for (size_t i = 0; i < dossier->tachos.count; i++) {
        if (strcmp(dossier->tachos.items[i].run, run) == 0)
            return dossier->tachos.items[i].speed_rpm;
    }
    for (size_t i = 0; i < dossier->readings.count; i++) {
        if (strcmp(dossier->readings.items[i].reading.run, run) == 0)
            return dossier->readings.items[i].reading.speed_rpm;
    }
    return NAN;
}

double dossier_number(const json_t *object, const char *key)
{
    const json_t *value = json_object_get(object, key);
    return json_is_number(value) ? json_number_value(value) : NAN;
}

const char *dossier_string(const json_t *object, const char *key)
{
    const char *text = json_string_value(json_object_get(object, key));
    return text ? text : "";
}

const json_t *dossier_instead(const struct dossier *dossier)
{
    const int run = job_find_run(dossier->job, "as found");
    return run >= 0 && !job_run_is_bare(dossier->job, (size_t)run)
               ? NULL
               : json_object_get(dossier->figures, "instead");
}

bool dossier_is_runout(const struct dossier *dossier, const char *run)
{
    const int index = job_find_run(dossier->job, run);
    return index >= 0 && strcmp(dossier->job->runs[index].role, "runout") == 0;
}

bool dossier_left_out(const struct dossier *dossier, int sensor, const char *condition)
{
    for (size_t i = 0; i < dossier->forecasts.count; i++) {
        const struct forecast_record *f = &dossier->forecasts.items[i];
        if (f->sensor == sensor && strcmp(f->condition, condition) == 0)
            return false;
    }
    return dossier->forecasts.count > 0;
}

bool dossier_is_unreadable(const struct finding_record *f)
{
    return f->verdict == VERDICT_REFUSE && strcmp(f->check, "readable") == 0;
}

enum verdict dossier_verdict(const struct dossier *dossier, const char *run, int sensor)
{
    enum verdict worst = VERDICT_OK;
    for (size_t i = 0; i < dossier->findings.count; i++) {
        const struct finding_record *f = &dossier->findings.items[i];
        if (strcmp(f->run, run) != 0 || (f->sensor >= 0 && f->sensor != sensor))
            continue;
        if (f->verdict > worst)
            worst = f->verdict;
    }
    return worst;
}

const char *dossier_sensor(const struct dossier *dossier, int sensor)
{
    return sensor >= 0 && (size_t)sensor < dossier->job->sensor_count
               ? dossier->job->sensors[sensor].name
               : "";
}

const char *dossier_plane(const struct dossier *dossier, int plane)
{
    return plane >= 0 && (size_t)plane < dossier->job->plane_count
               ? dossier->job->planes[plane].name
               : "";
}

/* A refusal by that stage and check; NULL: any. */
static bool refused_by(const struct dossier *d, const char *stage, const char *check)
{
    for (size_t i = 0; i < d->findings.count; i++) {
        const struct finding_record *f = &d->findings.items[i];
        if (f->verdict == VERDICT_REFUSE && (!stage || strcmp(f->stage, stage) == 0) &&
            (!check || strcmp(f->check, check) == 0))
            return true;
    }
    return false;
}

static bool any_weight(const struct dossier *d)
{
    for (size_t i = 0; d->job && i < d->job->run_count; i++) {
        if (!job_run_is_bare(d->job, i))
            return true;
    }
    return false;
}

static bool any_reading_lost(const struct dossier *d)
{
    for (size_t i = 0; i < d->readings.count; i++) {
        if (!d->readings.items[i].use || !d->readings.items[i].reading.has_phase)
            return true;
    }
    return false;
}

int dossier_answer(const struct dossier *dossier)
{
    const struct dossier *d = dossier;
    const char *step = d->has_next ? d->next.step : "";
    if (d->placements.count > 0 || strcmp(step, "done") == 0)
        return STATUS_DONE;
    if (refused_by(d, "solve", "correction") || refused_by(d, "solve", "correction-force"))
        return STATUS_UNSOLVED;
    if (strcmp(step, "repeat") == 0) {
        bool refused = any_reading_lost(d) || refused_by(d, "vet", NULL) ||
                       refused_by(d, "solve", "linearity");
        return refused ? STATUS_REFUSED : STATUS_UNSOLVED;
    }
    if (strcmp(step, "trial") == 0 && any_weight(d))
        return STATUS_UNSOLVED;
    return refused_by(d, "solve", NULL) ? STATUS_UNSOLVED : STATUS_DONE;
}

int dossier_status(const struct dossier *dossier)
{
    return refused_by(dossier, NULL, "readable") ? STATUS_RECORDING : dossier_answer(dossier);
}
