#include "track/tracker.h"

#include <math.h>
#include <stdlib.h>
#include <string.h>

#define LEVEL_SECONDS 2.0 /* looked at for the first levels: six turns at 180 rpm */
#define LEVEL_TURNS 6.0
#define JITTER_MOST 15.0 /* deg: marks at random within their tolerance scatter by 40 deg */
#define FEW_MARKS 20     /* as many turns as `length` wants at least */
#define KEEP 64          /* frames kept before the next turn, for edges and rounding */
/* So few steps of its resolution, and so little of full scale, is what a converter makes of
 * nothing. */
#define DEAD_STEPS 16
#define DEAD_SHARE 0.001

static int begin_tone(struct tracker *tracker, const struct tracker_set_up *set_up)
{
    int *velocities = calloc(tracker->sensors + 1, sizeof *velocities);
    struct tone_set_up tone = {set_up->rate_hz, set_up->frames, tracker->sensors,
                               set_up->service_rpm,
                               set_up->derivatives ? set_up->derivatives : velocities};
    int failed = velocities ? tone_init(&tracker->tone, &tone) : -1;

    free(velocities);
    return failed;
}

int tracker_init(struct tracker *tracker, const struct tracker_set_up *set_up)
{
    size_t columns = set_up->columns;

    *tracker = (struct tracker){.rate_hz = set_up->rate_hz,
                                .frames = set_up->frames,
                                .columns = columns,
                                .tacho = set_up->tacho,
                                .sensors = columns - (set_up->tacho >= 0),
                                .skipped = true,
                                .listening = true,
                                .sweeps = set_up->sweeps};
    tracker->most = (size_t)TRACKER_HOLD / (columns * sizeof(float));
    if (tracker->most < 4 * TRACKER_CHUNK) {
        tracker->most = 4 * TRACKER_CHUNK;
    }
    tracker->level_frames = LEVEL_SECONDS * set_up->rate_hz;
    if (set_up->service_rpm > 0) {
        tracker->level_frames =
            fmax(tracker->level_frames, LEVEL_TURNS * 60 / set_up->service_rpm * set_up->rate_hz);
    }
    tracker->level_frames = fmin(tracker->level_frames, (double)tracker->most / 2);
    pulse_init(&tracker->finder, set_up->edge, set_up->level);
    marks_init(&tracker->marks, set_up->marks);
    shape_init(&tracker->shape);
    shaft_init(&tracker->shaft);
    window_init(&tracker->windows, tracker->sensors);
    tracker->planes = calloc(2 * columns, sizeof *tracker->planes);
    tracker->channels = calloc(columns, sizeof *tracker->channels);
    tracker->offset = calloc(columns, sizeof *tracker->offset);
    tracker->sums = calloc(2 * tracker->sensors + 1, sizeof *tracker->sums);
    if (!tracker->planes || !tracker->channels || !tracker->offset || !tracker->sums ||
        begin_tone(tracker, set_up) || channel_pairs_init(&tracker->pairs, columns) ||
        teeth_init(&tracker->teeth, set_up->marks)) {
        tracker_release(tracker);
        return -1;
    }
    for (size_t c = 0; c < columns; c++) {
        channel_init(&tracker->channels[c], set_up->rail[c]);
    }
    return 0;
}

void tracker_release(struct tracker *tracker)
{
    free(tracker->data);
    free(tracker->planes);
    free(tracker->channels);
    free(tracker->offset);
    free(tracker->sums);
    channel_pairs_release(&tracker->pairs);
    window_release(&tracker->windows);
    teeth_release(&tracker->teeth);
    spectrum_end(&tracker->spectrum);
    tone_release(&tracker->tone);
    *tracker = (struct tracker){0};
}

static float *plane(const struct tracker *tracker, size_t column)
{
    return tracker->data + column * tracker->room;
}

/* ---- holding samples ---- */

static int hold_grow(struct tracker *tracker)
{
    size_t room = tracker->room ? 2 * tracker->room : 16 * TRACKER_CHUNK;

    room = room < tracker->most ? room : tracker->most;
    float *data = malloc(room * tracker->columns * sizeof *data);

    if (!data) {
        return -1;
    }
    for (size_t c = 0; c < tracker->columns && tracker->fill; c++) {
        memcpy(data + c * room, plane(tracker, c), tracker->fill * sizeof *data);
    }
    free(tracker->data);
    tracker->data = data;
    tracker->room = room;
    return 0;
}

/* Lets go of the frames before number `keep`, once that is worth moving the others; `now`: in any
 * case. */
static void hold_release(struct tracker *tracker, double keep, bool now)
{
    double gone = floor(keep) - (double)tracker->start;
    size_t count = gone > 0 ? (size_t)gone : 0;

    count = count < tracker->searched ? count : tracker->searched;
    if (!now && (count < 4 * TRACKER_CHUNK || count < tracker->fill - count)) {
        return;
    }
    for (size_t c = 0; c < tracker->columns; c++) {
        memmove(plane(tracker, c), plane(tracker, c) + count,
                (tracker->fill - count) * sizeof(float));
    }
    tracker->start += (long long)count;
    tracker->fill -= count;
    tracker->done -= count;
    tracker->searched -= count;
}

/* ---- turns ---- */

static void sum_spectrum(struct tracker *tracker, size_t from)
{
    for (size_t c = 0, s = 0; c < tracker->columns; c++) {
        if ((int)c != tracker->tacho) {
            spectrum_add(&tracker->spectrum, &tracker->weights, s++, plane(tracker, c) + from,
                         tracker->offset[c]);
        }
    }
}

/* Sums the turn's samples, twice where windows rise or fall in it. */
static void sum_turn(struct tracker *tracker, const struct shaft_turn *turn, bool ramps)
{
    long long i = (long long)ceil(turn->t0), end = (long long)ceil(turn->t1);
    struct vector_sums *full = tracker->sums, *ramped = full + tracker->sensors;

    memset(tracker->sums, 0, 2 * tracker->sensors * sizeof *tracker->sums);
    while (i < end) {
        size_t n = end - i < VECTOR_PIECE ? (size_t)(end - i) : VECTOR_PIECE;
        size_t from = (size_t)(i - tracker->start);

        vector_weigh(&tracker->weights, turn, (double)i, n);
        if (spectrum_wants(&tracker->spectrum)) {
            sum_spectrum(tracker, from);
        }
        for (int pass = 0; pass < (ramps ? 2 : 1); pass++) {
            if (pass) {
                vector_ramp(&tracker->weights);
            }
            for (size_t c = 0, s = 0; c < tracker->columns; c++) {
                if ((int)c != tracker->tacho) {
                    vector_add((pass ? ramped : full) + s++, &tracker->weights,
                               plane(tracker, c) + from, tracker->offset[c]);
                }
            }
        }
        i += (long long)n;
    }
}

/* The order spectrum's part of that. */
static void sum_orders(struct tracker *tracker, const struct shaft_turn *turn)
{
    long long i = (long long)ceil(turn->t0), end = (long long)ceil(turn->t1);

    while (i < end) {
        size_t n = end - i < VECTOR_PIECE ? (size_t)(end - i) : VECTOR_PIECE;

        vector_weigh(&tracker->weights, turn, (double)i, n);
        sum_spectrum(tracker, (size_t)(i - tracker->start));
        i += (long long)n;
    }
}

static void note_speed(struct tracker *tracker, const struct shaft_turn *turn)
{
    double speed = 1 / (turn->t1 - turn->t0), off = speed - tracker->turn_mean;

    tracker->turns++;
    tracker->turn_mean += off / tracker->turns;
    tracker->turn_squares += off * (speed - tracker->turn_mean);
    tracker->time += turn->t1 - turn->t0;
}

/* The period is known: settle what depends on it. */
static int first_turn(struct tracker *tracker, double period)
{
    tracker->windows.length =
        window_length(tracker->rate_hz, period, tracker->frames, tracker->sweeps);
    return spectrum_init(&tracker->spectrum, tracker->sensors, tracker->rate_hz, period,
                         tracker->frames);
}

/* All turns that are ready. 0, or -1 when memory is out. */
static int take_turns(struct tracker *tracker)
{
    struct shaft_turn turn;

    while (shaft_next(&tracker->shaft, &turn)) {
        if (turn.t0 < (double)tracker->start ||
            ceil(turn.t1) > (double)tracker->start + (double)tracker->fill) {
            tracker->skipped = true; /* its samples are gone, or never came */
            continue;
        }
        if (tracker->turns == 0 && first_turn(tracker, turn.t1 - turn.t0)) {
            return -1;
        }
        if (tracker->skipped) {
            spectrum_break(&tracker->spectrum);
        }
        turn.first |= tracker->skipped;
        if (tracker->marks.reference) {
            teeth_bend(&tracker->teeth, &turn);
        }
        tracker->skipped = false;
        bool ramps = window_ramps(&tracker->windows, &turn);

        sum_turn(tracker, &turn, ramps);
        spectrum_turn(&tracker->spectrum);
        note_speed(tracker, &turn);
        if (window_turn(&tracker->windows, &turn, tracker->sums,
                        tracker->sums + tracker->sensors)) {
            return -1;
        }
    }
    return 0;
}

static int break_stretch(struct tracker *tracker)
{
    shaft_end(&tracker->shaft);
    int failed = take_turns(tracker);

    shaft_restart(&tracker->shaft);
    teeth_break(&tracker->teeth);
    tracker->skipped = true;
    return failed;
}

static int take_marks(struct tracker *tracker, const struct mark *marks, size_t count)
{
    for (size_t i = 0; i < count; i++) {
        if (marks[i].breaks && break_stretch(tracker)) {
            return -1;
        }
        teeth_mark(&tracker->teeth, marks[i].at, marks[i].real);
        shaft_push(&tracker->shaft, marks[i].at, marks[i].real);
        if (take_turns(tracker)) {
            return -1;
        }
    }
    return 0;
}

/* ---- the tacho ---- */

static int take_pulses(struct tracker *tracker, const struct pulse *pulses, size_t count)
{
    struct mark marks[MARKS_ROOM];

    for (size_t i = 0; i < count; i++) {
        teeth_pulse(&tracker->teeth, pulses[i].at);
        if (take_marks(tracker, marks, marks_push(&tracker->marks, &pulses[i], marks))) {
            return -1;
        }
    }
    return 0;
}

/* No pulse for so long: perhaps the pulses became smaller than the levels allow. */
static void listen(struct tracker *tracker)
{
    size_t n = (size_t)tracker->level_frames;

    if (tracker->silent < tracker->level_frames) {
        return;
    }
    n = n < tracker->searched ? n : tracker->searched;
    tracker->silent = 0;
    (void)pulse_renew(&tracker->finder,
                      plane(tracker, (size_t)tracker->tacho) + tracker->searched - n, n);
}

/* Searches the frames that were not searched yet, chunk by chunk. */
static int search(struct tracker *tracker)
{
    struct pulse pulses[TRACKER_CHUNK / 2 + 1];

    while (tracker->searched < tracker->done) {
        size_t n = tracker->done - tracker->searched, at = tracker->searched;

        n = n < TRACKER_CHUNK ? n : TRACKER_CHUNK;
        size_t count = pulse_find(&tracker->finder, plane(tracker, (size_t)tracker->tacho) + at, n,
                                  at, (double)tracker->start + (double)at, pulses);

        tracker->searched += n;
        tracker->silent = count > 0 ? 0 : tracker->silent + (double)n;
        listen(tracker);
        if (take_pulses(tracker, pulses, count)) {
            return -1;
        }
    }
    return 0;
}

/* Too much is held: decide with what is known. */
static int relieve(struct tracker *tracker)
{
    struct mark marks[MARKS_ROOM];

    if (!tracker->marks.locked) {
        return take_marks(tracker, marks, marks_hurry(&tracker->marks, marks));
    }
    shaft_hurry(&tracker->shaft);
    return take_turns(tracker);
}

/* Still too much: leave out what cannot be held until its angle is known. */
static int give_up(struct tracker *tracker)
{
    struct mark marks[MARKS_ROOM];

    if (tracker->marks.locked &&
        (take_marks(tracker, marks, marks_finish(&tracker->marks, marks)) ||
         break_stretch(tracker))) {
        return -1;
    }
    marks_unlock(&tracker->marks);
    return 0;
}

/* The first frame that may still be needed. */
static double needed(const struct tracker *tracker)
{
    if (tracker->marks.locked && tracker->shaft.next > 0) {
        return shaft_begin(&tracker->shaft) - KEEP;
    }
    return (double)tracker->start; /* marks may still come of it */
}

/* Without a tacho: order spectra over turns at the speed of the line that is followed. */
static int take_tone(struct tracker *tracker)
{
    double end = (double)tracker->start + (double)tracker->done;
    struct shaft_turn turn;

    while (tone_turn(&tracker->tone, end, &turn)) {
        if (tracker->spectrum.turns == 0 &&
            spectrum_init(&tracker->spectrum, tracker->sensors, tracker->rate_hz, turn.t1 - turn.t0,
                          tracker->frames)) {
            return -1;
        }
        if (turn.t0 < (double)tracker->start) {
            spectrum_break(&tracker->spectrum); /* its samples are gone */
            continue;
        }
        if (spectrum_wants(&tracker->spectrum)) {
            sum_orders(tracker, &turn);
        }
        spectrum_turn(&tracker->spectrum);
    }
    return 0;
}

/* Without a tacho, the frames up to `done`; all are held until the line is found. */
static int advance_tone(struct tracker *tracker)
{
    double end = (double)tracker->start + (double)tracker->done, keep = (double)tracker->start;
    bool full = tracker->most - tracker->done < 2 * TRACKER_CHUNK;

    if (take_tone(tracker)) {
        return -1;
    }
    tracker->searched = tracker->done;
    if (tracker->tone.looked) {
        keep = tracker->tone.found ? tracker->tone.turned - KEEP : end;
    }
    hold_release(tracker, full ? fmax(keep, (keep + end) / 2) : keep, full);
    return 0;
}

/* Works on the frames up to `done`. */
static int advance(struct tracker *tracker, bool last)
{
    double keep = (double)tracker->start + (double)tracker->done;
    bool full = tracker->most - tracker->done < 2 * TRACKER_CHUNK;

    if (tracker->tacho < 0) {
        return advance_tone(tracker);
    }
    if (!tracker->finder.live) {
        if (!last && (double)tracker->done < tracker->level_frames) {
            return 0;
        }
        if (!pulse_levels(&tracker->finder, plane(tracker, (size_t)tracker->tacho),
                          tracker->done)) {
            tracker->searched = tracker->done; /* constant so far */
            hold_release(tracker, keep - KEEP, false);
            return 0;
        }
    }
    if (search(tracker) || (full && relieve(tracker))) {
        return -1;
    }
    keep = fmin(keep - KEEP, needed(tracker));
    if (full && keep < (double)tracker->start + 2 * TRACKER_CHUNK) {
        if (give_up(tracker)) {
            return -1;
        }
        keep = (double)tracker->start + (double)tracker->done / 2;
    }
    hold_release(tracker, keep, full);
    return 0;
}

/* ---- chunks ---- */

static int add_tone(struct tracker *tracker, size_t n)
{
    const float **sensors = tracker->planes + tracker->columns;

    for (size_t c = 0, s = 0; c < tracker->columns; c++) {
        if ((int)c != tracker->tacho) {
            sensors[s++] = tracker->planes[c];
        }
    }
    return tone_add(&tracker->tone, sensors, n);
}

static bool dead(const struct tracker *tracker)
{
    const struct channel *tacho = &tracker->channels[tracker->tacho];
    double step = channel_resolution(tacho), range = (double)tacho->max - (double)tacho->min;

    return !(step > 0) || (range <= DEAD_STEPS * step && range <= DEAD_SHARE * tacho->rail);
}

void tracker_phase_only(struct tracker *tracker)
{
    if (tracker->tacho >= 0 && tracker->listening) {
        tone_release(&tracker->tone);
        tracker->listening = false;
    }
}

static int chunk(struct tracker *tracker, size_t n, bool last)
{
    for (size_t c = 0; c < tracker->columns; c++) {
        const float *x = plane(tracker, c) + tracker->done;

        if (tracker->start == 0 && tracker->done == 0) {
            double sum = 0;

            for (size_t i = 0; i < n; i++) {
                sum += x[i];
            }
            tracker->offset[c] = (float)(sum / (double)n);
        }
        channel_add(&tracker->channels[c], x, n);
        tracker->planes[c] = x;
    }
    if (tracker->tacho >= 0) {
        shape_add(&tracker->shape, tracker->planes[tracker->tacho], n);
    }
    channel_pairs_add(&tracker->pairs, tracker->planes, n);
    if (tracker->tacho >= 0 && !dead(tracker)) {
        tracker_phase_only(tracker);
    }
    if (tracker->listening && add_tone(tracker, n)) {
        return -1;
    }
    tracker->done += n;
    return advance(tracker, last);
}

static void spread_out(struct tracker *tracker, const float *frames, size_t n)
{
    size_t columns = tracker->columns;

    for (size_t c = 0; c < columns; c++) {
        float *out = plane(tracker, c) + tracker->fill;

        for (size_t i = 0; i < n; i++) {
            out[i] = frames[i * columns + c];
        }
    }
    tracker->fill += n;
}

int tracker_add(struct tracker *tracker, const float *frames, size_t n)
{
    while (n > 0) {
        size_t need = TRACKER_CHUNK - (tracker->fill - tracker->done);
        size_t take = n < need ? n : need;

        if (tracker->fill + take > tracker->room && hold_grow(tracker)) {
            return -1;
        }
        spread_out(tracker, frames, take);
        frames += take * tracker->columns;
        n -= take;
        if (take == need && chunk(tracker, TRACKER_CHUNK, false)) {
            return -1;
        }
    }
    return 0;
}

int tracker_finish(struct tracker *tracker)
{
    struct mark marks[MARKS_ROOM];
    struct pulse pulse;
    size_t rest = tracker->fill - tracker->done;

    if (rest > 0 && chunk(tracker, rest, true)) {
        return -1;
    }
    if (tracker->tacho < 0) {
        return tone_finish(&tracker->tone) ? -1 : take_tone(tracker);
    }
    if (rest == 0 && tracker->done > 0 && advance(tracker, true)) {
        return -1;
    }
    double end = (double)tracker->start + (double)tracker->fill;

    if (take_pulses(tracker, &pulse, pulse_finish(&tracker->finder, end, &pulse)) ||
        take_marks(tracker, marks, marks_finish(&tracker->marks, marks)) ||
        break_stretch(tracker)) {
        return -1;
    }
    return tracker->listening ? tone_finish(&tracker->tone) : 0;
}

/* Few marks that nothing speaks for but themselves must be nearly whole; and a rhythm is none that
 * needs more marks put in than came, or leaves out more than three for each (a turn has at most so
 * many scratches). */
static bool believable(const struct marks *marks, double jitter)
{
    long extra = marks_extra(marks), wrong = marks->missed + extra;

    if (isnan(jitter) || marks->count < FEW_MARKS) {
        return 4 * wrong <= marks->count;
    }
    return jitter < JITTER_MOST && marks->missed <= marks->count && extra <= 3 * marks->count;
}

bool tracker_regular(const struct tracker *tracker)
{
    return tracker->windows.count > 0 && tracker_pulsed(tracker) &&
           believable(&tracker->marks, shaft_jitter(&tracker->shaft));
}

bool tracker_toned(const struct tracker *tracker)
{
    return tracker->tacho < 0 ||
           (tracker->listening && tracker->tone.found && !tracker_regular(tracker));
}

bool tracker_reference(const struct tracker *tracker)
{
    return tracker_regular(tracker) && tracker->marks.reference;
}

bool tracker_pulsed(const struct tracker *tracker)
{
    return shape_pulsed(&tracker->shape);
}

double tracker_speed(const struct tracker *tracker)
{
    return tracker->turns > 0 ? 60 * tracker->rate_hz * tracker->turns / tracker->time : NAN;
}

double tracker_scatter(const struct tracker *tracker)
{
    return tracker->turns > 1
               ? 60 * tracker->rate_hz * sqrt(tracker->turn_squares / (tracker->turns - 1))
               : NAN;
}
