#include "solve/model.h"

#include <math.h>
#include <stdlib.h>
#include <string.h>

#include "base/angle.h"
#include "sheet/units.h"
#include "solve/amplitude.h"
#include "solve/culprit.h"
#include "solve/regress.h"
#include "solve/repeat.h"
#include "solve/stored.h"

static int by_run(const void *a, const void *b)
{
    const struct model_reading *x = a, *y = b;
    if (x->run != y->run)
        return x->run < y->run ? -1 : 1;
    if (x->sensor != y->sensor)
        return x->sensor < y->sensor ? -1 : 1;
    return x->place < y->place
               ? -1
               : x->place > y->place; /* conditions as they came: as the sheet has them */
}

static bool ordinary(const struct job_run *run)
{
    return run->role[0] == '\0' || !strcmp(run->role, "coast-down");
}

static size_t find_condition(struct model *m, const char *name)
{
    for (size_t c = 0; c < m->condition_count; c++)
        if (!strcmp(m->conditions[c], name))
            return c;
    return m->condition_count;
}

static void add_condition(struct model *m, const char *name)
{
    if (find_condition(m, name) == m->condition_count)
        memcpy(m->conditions[m->condition_count++], name, NAME_ROOM);
}

static int row_room(struct model_row *row, size_t count, size_t planes)
{
    row->runs = calloc(count + 1, sizeof *row->runs);
    row->y = calloc(count + 1, sizeof *row->y);
    row->x = calloc(count * planes + 1, sizeof *row->x);
    row->cov = calloc(count + 1, sizeof *row->cov);
    row->total = calloc(count + 1, sizeof *row->total);
    row->stored = calloc(planes + 1, sizeof *row->stored);
    row->overall = calloc(count + 1, sizeof *row->overall);
    row->possible = calloc(count + 1, sizeof *row->possible);
    return row->runs && row->y && row->x && row->cov && row->total && row->stored && row->overall &&
                   row->possible
               ? 0
               : -1;
}

static void row_take(struct model_row *row, const struct model *m, const struct model_reading *r)
{
    size_t i = row->count++;
    const struct job *job = m->job;
    row->runs[i] = r->run;
    row->y[i] = r->phase ? r->vector : r->amplitude;
    if (row->runout)
        row->y[i] -= m->runout[row->sensor].vector;
    memcpy(row->cov[i], r->cov, sizeof r->cov);
    row->overall[i] = r->overall > 0 ? r->overall : NAN;
    row->overall_quantity = r->overall_quantity;
    for (size_t p = 0; p < job->plane_count; p++)
        row->x[i * job->plane_count + p] = job_run_weight(job, r->run, p);
}

/* Mean amplitude of the readings with nothing mounted; else of the first; 1 where all are zero. */
static double as_found(const struct model_row *row, const struct job *job)
{
    double sum = 0;
    size_t bare = 0;
    for (size_t i = 0; i < row->count; i++)
        if (job_run_is_bare(job, row->runs[i])) {
            sum += cabs(row->y[i]);
            bare++;
        }
    double size = bare ? sum / (double)bare : row->count ? cabs(row->y[0]) : 1;
    for (size_t i = 0; i < row->count && !(size > 0); i++)
        size = cabs(row->y[i]);
    return size > 0 ? size : 1;
}

static void set_target(struct model_row *row, const struct job *job)
{
    row->target = NAN;
    row->in_aim = true;
    if (!job->aim.targets)
        return;
    const struct job_target *t = &job->aim.targets[row->sensor];
    row->in_aim = t->in_aim || !job->aim.named;
    if (isnan(t->amplitude))
        return;
    enum quantity own = job->sensors[row->sensor].quantity;
    double w = row->speed_rpm * PI / 30;
    if (own == t->quantity)
        row->target = t->amplitude;
    else if (w > 0)
        row->target = cabs(units_convert(t->amplitude, t->quantity, own, w));
}

/* Gathers the usable readings of a row; `all` gets the weights of every reading, usable or not. */
static int gather(struct model *m, struct model_row *row, const struct model_reading *readings,
                  size_t count)
{
    const struct job *job = m->job;
    size_t planes = job->plane_count, every = 0;
    double complex *all = calloc(count * planes + 1, sizeof *all);
    if (!all || row_room(row, count, planes) != 0) {
        free(all);
        return MODEL_NO_MEMORY;
    }
    double speed = 0;
    size_t timed = 0;
    row->runout = m->runout[row->sensor].count > 0 && !m->amplitudes;
    for (size_t i = 0; i < count; i++) {
        const struct model_reading *r = &readings[i];
        if (r->sensor != row->sensor || strcmp(r->condition, m->conditions[row->condition]) ||
            !ordinary(&job->runs[r->run]))
            continue;
        for (size_t p = 0; p < planes; p++)
            all[every * planes + p] = job_run_weight(job, r->run, p);
        every++;
        if (!r->use || r->phase == m->amplitudes) {
            row->lost_run = row->lost_run < 0 ? (int)r->run : row->lost_run;
            continue;
        }
        row_take(row, m, r);
        if (r->speed_rpm > 0) {
            speed += r->speed_rpm;
            timed++;
        }
    }
    row->speed_rpm = timed ? speed / (double)timed : job->service_rpm;
    row->as_found = as_found(row, job);
    set_target(row, job);
    stored_match(m, row);
    int could = stored_rank(row, planes, every, all);
    int can = stored_rank(row, planes, row->count, row->x);
    free(all);
    if (could < 0 || can < 0)
        return could == REGRESS_FAILED || can == REGRESS_FAILED ? MODEL_FAILED : MODEL_NO_MEMORY;
    row->lacks = could > can;
    row->state = can == (int)planes + 1     ? MODEL_GOOD
                 : could == (int)planes + 1 ? MODEL_LOST
                                            : MODEL_SHORT;
    return MODEL_OK;
}

static bool equal_weights(const struct model_row *row, size_t a, size_t b, size_t planes)
{
    for (size_t p = 0; p < planes; p++) {
        double complex u = row->x[a * planes + p], v = row->x[b * planes + p];
        if (cabs(u - v) > 1e-9 * (cabs(u) + cabs(v)))
            return false;
    }
    return true;
}

/* Adds each group of equal weights of the row to the pool. */
static int pool_row(struct repeat_pool *pool, const struct model_row *row, size_t planes)
{
    double complex *y = calloc(row->count + 1, sizeof *y);
    double(*cov)[3] = calloc(row->count + 1, sizeof *cov);
    bool *seen = calloc(row->count + 1, sizeof *seen);
    int result = y && cov && seen ? MODEL_OK : MODEL_NO_MEMORY;
    for (size_t i = 0; result == MODEL_OK && i < row->count; i++) {
        size_t n = 0;
        for (size_t j = i; j < row->count; j++)
            if (!seen[j] && equal_weights(row, i, j, planes)) {
                seen[j] = true;
                y[n] = row->y[j];
                memcpy(cov[n++], row->cov[j], sizeof cov[0]);
            }
        repeat_add(pool, y, (const double(*)[3])cov, n, row->as_found);
    }
    free(seen);
    free(cov);
    free(y);
    return result;
}

/* Runs that visibly do not fit one set of responses know no better than they agree: all variances
 * by the square of the misfit (the ratio of R. T. Birge, Phys. Rev. 40 (1932) 207-227), and t of
 * the spare figures; fewer than three have no variance, hence count as three. */
static void widen_misfit(const struct model *m, struct model_row *row)
{
    size_t n = row->posterior.unknowns;
    double spare = m->amplitudes ? (double)row->count - 3 : 2 * ((double)row->count - (double)n);
    row->widened = 1;
    if (!(row->misfit >= MODEL_MISFIT) || isinf(row->misfit))
        return;
    row->widened = row->misfit * row->misfit;
    for (size_t i = 0; i < 4 * n * n; i++)
        row->posterior.cov[i] *= row->widened;
    row->posterior.dof = fmin(row->posterior.dof, fmax(spare, 3));
}

/* The row from amplitudes alone: three trials and as found, or it is short. */
static int fit_amplitudes(const struct model *m, struct model_row *row)
{
    double *real = calloc(2 * row->count + 1, sizeof *real);
    int result = MODEL_OK;
    if (!real)
        return MODEL_NO_MEMORY;
    for (size_t i = 0; i < row->count; i++) {
        real[i] = creal(row->y[i]);
        real[row->count + i] = row->total[i][0];
    }
    size_t which;
    int error = amplitude_fit(row->count, real, row->x, real + row->count, row->as_found,
                              &row->posterior, &row->misfit, &which);
    if (error == AMPLITUDE_AMBIGUOUS && amplitude_pair(row->count, real, row->x, real + row->count,
                                                       row->as_found, row->either) != AMPLITUDE_OK)
        row->either[0] = row->either[1] = NAN;
    free(real);
    row->misfit_run = row->count > 0 ? row->runs[which] : 0;
    if (error == AMPLITUDE_OK) {
        row->state = MODEL_GOOD;
        row->posterior.dof = m->dof;
        widen_misfit(m, row);
    } else if (error == AMPLITUDE_AMBIGUOUS) {
        row->ambiguous = row->count >= 4;
        row->state = row->ambiguous || row->lost_run < 0 ? MODEL_SHORT : MODEL_LOST;
        result = posterior_init(&row->posterior, 2) == 0 ? MODEL_OK : MODEL_NO_MEMORY;
    } else {
        result = error == AMPLITUDE_NAN ? MODEL_NAN : MODEL_NO_MEMORY;
    }
    return result;
}

/* Who it may be, where the readings do not fit each other. */
static int find_culprit(const struct model *m, struct model_row *row)
{
    struct regress_data data = {.count = row->count,
                                .planes = m->job->plane_count,
                                .y = row->y,
                                .x = row->x,
                                .cov = (const double(*)[3])row->total,
                                .scale = row->as_found};
    int which;
    if (!(row->misfit >= MODEL_MISFIT))
        return MODEL_OK;
    bool mirrored = false;
    int result = culprit_find(&data, MODEL_MISFIT, row->possible, &which);
    if (result == REGRESS_OK && which >= 0)
        result = culprit_mirrored(&data, MODEL_MISFIT, &mirrored);
    for (size_t i = 0; mirrored && i < row->count; i++)
        row->possible[i] = false;
    int on = -1, in = -1;
    if (result == REGRESS_OK)
        result = culprit_left_on(&data, MODEL_EXPLAINED, &on, &in);
    row->left_on = on >= 0 ? (int)row->runs[on] : -1;
    row->left_in = in >= 0 ? (int)row->runs[in] : -1;
    row->culprit = result == REGRESS_OK && which >= 0 && !mirrored ? (int)row->runs[which] : -1;
    return result == REGRESS_OK          ? MODEL_OK
           : result == REGRESS_NO_MEMORY ? MODEL_NO_MEMORY
                                         : MODEL_FAILED;
}

static int fit_row(struct model *m, struct model_row *row)
{
    row->sigma = m->repeatability * row->as_found;
    for (size_t i = 0; i < row->count; i++)
        for (int k = 0; k < 3; k++) {
            row->total[i][k] = row->cov[i][k] + (k == 1 ? 0 : row->sigma * row->sigma);
            row->typical[k] += row->cov[i][k] / (double)row->count;
        }
    if (m->amplitudes)
        return fit_amplitudes(m, row);
    int result = stored_fit(row, m->job->plane_count);
    if (result != REGRESS_OK)
        return result == REGRESS_NO_MEMORY ? MODEL_NO_MEMORY
               : result == REGRESS_NAN     ? MODEL_NAN
                                           : MODEL_FAILED;
    row->posterior.dof = m->dof;
    widen_misfit(m, row);
    result = find_culprit(m, row);
    if (result != MODEL_OK)
        return result;
    for (size_t p = 0; p < m->job->plane_count; p++)
        m->held[p] = m->held[p] || row->stored[p];
    if (row->runout) { /* one error that all readings share: Z0 has it, no response does */
        const double *cov = m->runout[row->sensor].cov;
        size_t width = 2 * row->posterior.unknowns;
        row->posterior.cov[0] += cov[0];
        row->posterior.cov[1] += cov[1];
        row->posterior.cov[width] += cov[1];
        row->posterior.cov[width + 1] += cov[2];
    }
    return MODEL_OK;
}

/* The slow-roll vectors of displacement sensors: what the probe sees of the shaft's surface. */
static void gather_runout(struct model *m, const struct model_reading *readings, size_t count)
{
    const struct job *job = m->job;
    for (size_t i = 0; i < count; i++) {
        const struct model_reading *r = &readings[i];
        if (strcmp(job->runs[r->run].role, "runout") != 0 || !r->use || !r->phase ||
            job->sensors[r->sensor].quantity != QUANTITY_DISPLACEMENT)
            continue;
        struct model_runout *o = &m->runout[r->sensor];
        double n = (double)++o->count, keep = (n - 1) / n;
        o->vector = keep * o->vector + r->vector / n;
        o->speed_rpm = keep * o->speed_rpm + r->speed_rpm / n;
        for (int k = 0; k < 3; k++)
            o->cov[k] = keep * keep * o->cov[k] + r->cov[k] / (n * n);
    }
}

/* A probe without the slow-roll vector that the sheet wants taken off is lost. */
static void lose_unrolled(const struct model *m, struct model_row *row)
{
    bool probe = m->job->sensors[row->sensor].quantity == QUANTITY_DISPLACEMENT;
    bool read = row->count > 0 || row->lost_run >= 0;
    row->unrolled = m->runout_run >= 0 && probe && read && !row->runout;
    if (!row->unrolled)
        return;
    row->state = MODEL_LOST;
    row->lost_run = m->runout_run;
}

static int find_runout(const struct job *job)
{
    for (size_t i = 0; i < job->run_count; i++)
        if (!strcmp(job->runs[i].role, "runout"))
            return (int)i;
    return -1;
}

static bool amplitudes_only(const struct job *job, const struct model_reading *readings,
                            size_t count)
{
    size_t usable = 0;
    for (size_t i = 0; i < count; i++) {
        if (!ordinary(&job->runs[readings[i].run]))
            continue;
        if (readings[i].use && readings[i].phase)
            return false;
        usable += readings[i].use;
    }
    return usable > 0 && job->plane_count == 1;
}

int model_init(struct model *m, const struct job *job, struct model_reading *readings, size_t count)
{
    memset(m, 0, sizeof *m);
    m->job = job;
    m->last_run = -1;
    m->runout_run = find_runout(job);
    for (size_t i = 0; i < count; i++)
        readings[i].place = i;
    if (count > 0)
        qsort(readings, count, sizeof *readings, by_run);
    m->conditions = calloc(job->run_count + count + 1, sizeof *m->conditions);
    m->rows = calloc((job->run_count + count + 1) * (job->sensor_count + 1), sizeof *m->rows);
    m->present = calloc(job->run_count + 1, sizeof *m->present);
    m->runout = calloc(job->sensor_count + 1, sizeof *m->runout);
    m->held = calloc(job->plane_count + 1, sizeof *m->held);
    int result =
        m->conditions && m->rows && m->present && m->runout && m->held ? MODEL_OK : MODEL_NO_MEMORY;
    m->amplitudes = amplitudes_only(job, readings, count);
    if (result == MODEL_OK)
        gather_runout(m, readings, count);
    for (size_t i = 0; i < count && result == MODEL_OK; i++) {
        m->present[readings[i].run] = true;
        if (!ordinary(&job->runs[readings[i].run]))
            continue;
        add_condition(m, readings[i].condition);
        if (readings[i].use && readings[i].phase != m->amplitudes &&
            (int)readings[i].run > m->last_run)
            m->last_run = (int)readings[i].run;
    }
    struct repeat_pool pool = {0};
    for (size_t c = 0; c < m->condition_count; c++)
        for (size_t s = 0; s < job->sensor_count && result == MODEL_OK; s++) {
            struct model_row *row = &m->rows[m->row_count++];
            row->condition = c;
            row->sensor = s;
            row->misfit = row->changed = NAN;
            row->widened = 1;
            row->changed_plane = -1;
            row->lost_run = row->culprit = row->left_on = row->left_in = -1;
            result = gather(m, row, readings, count);
            if (result == MODEL_OK && !m->amplitudes)
                result = pool_row(&pool, row, job->plane_count);
        }
    m->repeatability = repeat_estimate(&pool, job->aim.repeatability, &m->dof);
    m->repeats = pool.dof;
    for (size_t r = 0; r < m->row_count && result == MODEL_OK; r++)
        result = fit_row(m, &m->rows[r]);
    for (size_t r = 0; r < m->row_count; r++)
        lose_unrolled(m, &m->rows[r]);
    if (result != MODEL_OK)
        model_release(m);
    return result;
}

void model_release(struct model *m)
{
    for (size_t r = 0; r < m->row_count; r++) {
        struct model_row *row = &m->rows[r];
        posterior_release(&row->posterior);
        free(row->runs);
        free(row->y);
        free(row->x);
        free(row->cov);
        free(row->total);
        free(row->stored);
        free(row->possible);
        free(row->overall);
    }
    free(m->runout);
    free(m->held);
    free(m->present);
    free(m->rows);
    free(m->conditions);
    memset(m, 0, sizeof *m);
}

bool model_is_bare(const struct model *m)
{
    for (size_t i = 0; i < m->job->run_count; i++)
        if (!job_run_is_bare(m->job, i))
            return false;
    return true;
}

int model_rank_before(const struct model *m, size_t end)
{
    size_t planes = m->job->plane_count, n = 0;
    double complex *x = calloc(end * planes + 1, sizeof *x);
    if (!x)
        return REGRESS_NO_MEMORY;
    for (size_t i = 0; i < end; i++) {
        if (!ordinary(&m->job->runs[i]) ||
            strcmp(m->job->runs[i].condition, m->job->runs[end].condition) != 0)
            continue;
        for (size_t p = 0; p < planes; p++)
            x[n * planes + p] = job_run_weight(m->job, i, p);
        n++;
    }
    int rank = regress_rank(n, planes, x, m->held);
    free(x);
    return rank;
}

bool model_refuse(const struct model *m, const struct model_row *row, int run,
                  struct model_reading *readings, size_t count)
{
    bool found = false;
    for (size_t i = 0; i < count; i++) {
        struct model_reading *r = &readings[i];
        if ((int)r->run != run || r->sensor != row->sensor || !r->use ||
            strcmp(r->condition, m->conditions[row->condition]) != 0)
            continue;
        r->use = false;
        found = true;
    }
    return found;
}

const double complex *model_find(const struct model_row *row, size_t run)
{
    for (size_t i = 0; i < row->count; i++)
        if (row->runs[i] == run)
            return &row->y[i];
    return NULL;
}
