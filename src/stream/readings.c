/* The records of a reading and of what is thought of it: reading, vetted, finding. */
#include "stream/records.h"

#include <math.h>
#include <string.h>

#include "stream/fields.h"

static const char *const verdict_names[] = {"ok", "caution", "refuse"};

struct steady steady_unknown(void)
{
    return (struct steady){.amplitude_pct = NAN,
                           .phase_deg = NAN,
                           .resultant = NAN,
                           .drift_pct = NAN,
                           .speed_pct = NAN,
                           .independent = NAN,
                           .beat_pct = NAN,
                           .beat_s = NAN,
                           .neighbour_hz = NAN,
                           .step_pct = NAN,
                           .step_s = NAN,
                           .wander_pct = NAN};
}

static void print_steady(const struct steady *s, struct line *line)
{
    line_open(line, "steady", '{');
    line_real(line, "amplitude_pct", s->amplitude_pct);
    line_real(line, "phase_deg", s->phase_deg);
    line_real(line, "resultant", s->resultant);
    line_real(line, "drift_pct", s->drift_pct);
    line_real(line, "speed_pct", s->speed_pct);
    line_real(line, "independent", s->independent);
    line_integer(line, "set_aside", s->set_aside);
    line_integer(line, "turns", s->turns);
    line_real(line, "beat_pct", s->beat_pct);
    line_real(line, "beat_s", s->beat_s);
    line_real(line, "neighbour_hz", s->neighbour_hz);
    line_real(line, "step_pct", s->step_pct);
    line_real(line, "step_s", s->step_s);
    line_real(line, "wander_pct", s->wander_pct);
    line_close(line, '}');
}

void reading_print(const struct reading_record *r, const struct job *job, struct line *line)
{
    line_begin(line, "reading");
    line_text(line, "run", r->run);
    line_text(line, "condition", r->condition);
    line_text(line, "sensor", job->sensors[r->sensor].name);
    line_real(line, "speed_rpm", r->speed_rpm);
    line_vector(line, "vector", r->has_phase ? r->vector : CMPLX(NAN, NAN));
    if (!r->has_phase)
        line_real(line, "amplitude", r->amplitude);
    line_covariance(line, "cov", r->cov);
    line_integer(line, "blocks", r->blocks);
    print_steady(&r->steady, line);
    if (isnan(r->overall.rms)) {
        line_null(line, "overall");
    } else {
        line_open(line, "overall", '{');
        line_real(line, "rms", r->overall.rms);
        line_text(line, "quantity", quantity_text(r->overall.quantity));
        line_real(line, "from_hz", r->overall.from_hz);
        line_real(line, "to_hz", r->overall.to_hz);
        line_close(line, '}');
    }
    line_end(line);
}

static void parse_steady(struct steady *s, struct fields *outer)
{
    const json_t *json = fields_object(outer, "steady");
    *s = steady_unknown();
    if (!json)
        return;
    struct fields f = fields_of(json);
    s->amplitude_pct = fields_real(&f, "amplitude_pct");
    s->phase_deg = fields_real(&f, "phase_deg");
    s->resultant = fields_real(&f, "resultant");
    s->drift_pct = fields_real(&f, "drift_pct");
    s->speed_pct = fields_real(&f, "speed_pct");
    s->independent = fields_real(&f, "independent");
    s->set_aside = (long)fields_integer(&f, "set_aside", 0);
    s->turns = (long)fields_integer(&f, "turns", 0);
    s->beat_pct = fields_real(&f, "beat_pct");
    s->beat_s = fields_real(&f, "beat_s");
    s->neighbour_hz = fields_real(&f, "neighbour_hz");
    s->step_pct = fields_real(&f, "step_pct");
    s->step_s = fields_real(&f, "step_s");
    s->wander_pct = fields_real(&f, "wander_pct");
    if (f.why)
        fields_fail(outer, f.why);
}

static void parse_overall(struct overall *o, struct fields *outer)
{
    const json_t *json = fields_object(outer, "overall");
    *o = (struct overall){NAN, QUANTITY_VELOCITY, NAN, NAN};
    if (!json)
        return;
    struct fields f = fields_of(json);
    int quantity = quantity_parse(fields_text(&f, "quantity"));
    o->rms = fields_real(&f, "rms");
    o->quantity = quantity < 0 ? QUANTITY_VELOCITY : (enum quantity)quantity;
    o->from_hz = fields_real(&f, "from_hz");
    o->to_hz = fields_real(&f, "to_hz");
    if (quantity < 0)
        fields_fail(&f, "a quantity that this version does not know");
    if (f.why)
        fields_fail(outer, f.why);
}

/* The run's condition, or that at a speed of its coast-down: "<condition> @ 900 rpm". */
static bool is_condition_of(const struct job *job, const char *run, const char *condition)
{
    int index = job_find_run(job, run);
    if (index < 0)
        return true; /* a run that the job does not name is its reader's business */
    size_t length = strlen(job->runs[index].condition);
    return !strncmp(condition, job->runs[index].condition, length) &&
           (!condition[length] || !strncmp(condition + length, " @ ", 3));
}

int reading_parse(struct reading_record *r, const struct job *job, const json_t *json,
                  const char **why)
{
    struct fields f = fields_of(json);
    *r = (struct reading_record){0};
    fields_name(&f, "run", r->run);
    fields_name(&f, "condition", r->condition);
    r->sensor = fields_sensor(&f, "sensor", job);
    if (!f.why && !is_condition_of(job, r->run, r->condition))
        fields_fail(&f, "the condition is not that of the run");
    r->speed_rpm = fields_above_zero(&f, "speed_rpm");
    r->has_phase = fields_has(&f, "vector");
    r->vector = fields_vector(&f, "vector");
    r->amplitude = r->has_phase ? cabs(r->vector) : fields_need_real(&f, "amplitude");
    fields_covariance(&f, "cov", r->cov);
    r->blocks = (long)fields_integer(&f, "blocks", 0);
    parse_steady(&r->steady, &f);
    parse_overall(&r->overall, &f);
    return fields_done(&f, why);
}

void vetted_print(const struct vetted_record *r, const struct job *job, struct line *line)
{
    line_begin(line, "vetted");
    line_text(line, "run", r->run);
    line_text(line, "sensor", job->sensors[r->sensor].name);
    if (r->condition[0])
        line_text(line, "condition", r->condition);
    line_boolean(line, "use", r->use);
    line_covariance(line, "widen", r->widen);
    if (r->by_speed > 0)
        line_real(line, "by_speed", r->by_speed);
    line_end(line);
}

int vetted_parse(struct vetted_record *r, const struct job *job, const json_t *json,
                 const char **why)
{
    struct fields f = fields_of(json);
    *r = (struct vetted_record){0};
    fields_name(&f, "run", r->run);
    r->sensor = fields_sensor(&f, "sensor", job);
    fields_copy(&f, "condition", r->condition, sizeof r->condition);
    if (!fields_has(&f, "use"))
        fields_fail(&f, "the ruling is missing");
    r->use = fields_boolean(&f, "use", false);
    fields_covariance(&f, "widen", r->widen);
    if (fields_has(&f, "by_speed"))
        r->by_speed = fields_real(&f, "by_speed");
    return fields_done(&f, why);
}

bool vetted_is_of(const struct vetted_record *v, const struct reading_record *r)
{
    return v->sensor == r->sensor && !strcmp(v->run, r->run) &&
           (!v->condition[0] || !strcmp(v->condition, r->condition));
}

void finding_print(const struct finding_record *r, const struct job *job, struct line *line)
{
    line_begin(line, "finding");
    line_text(line, "stage", r->stage);
    line_text(line, "check", r->check);
    line_text(line, "verdict", verdict_names[r->verdict]);
    line_text(line, "run", r->run[0] ? r->run : NULL);
    line_text(line, "sensor", r->sensor < 0 ? NULL : job->sensors[r->sensor].name);
    line_real(line, "value", r->value);
    line_real(line, "limit", r->limit);
    line_text(line, "unit", r->unit);
    line_text(line, "basis", r->basis);
    line_text(line, "text", r->text);
    line_end(line);
}

int finding_parse(struct finding_record *r, const struct job *job, const json_t *json,
                  const char **why)
{
    struct fields f = fields_of(json);
    *r = (struct finding_record){.sensor = -1};
    fields_copy(&f, "stage", r->stage, sizeof r->stage);
    fields_name(&f, "check", r->check);
    const char *verdict = fields_text(&f, "verdict");
    int found = -1;
    for (int i = 0; i < 3; i++)
        if (!strcmp(verdict, verdict_names[i]))
            found = i;
    if (found < 0)
        fields_fail(&f, "a verdict that this version does not know");
    else
        r->verdict = (enum verdict)found;
    fields_copy(&f, "run", r->run, sizeof r->run);
    if (fields_has(&f, "sensor"))
        r->sensor = fields_sensor(&f, "sensor", job);
    r->value = fields_real(&f, "value");
    r->limit = fields_real(&f, "limit");
    fields_copy(&f, "unit", r->unit, sizeof r->unit);
    fields_copy(&f, "basis", r->basis, sizeof r->basis);
    fields_copy(&f, "text", r->text, sizeof r->text);
    return fields_done(&f, why);
}
