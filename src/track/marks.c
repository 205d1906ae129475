#include "track/marks.h"

#include <math.h>
#include <string.h>

/* How far from its expected time a mark may come, as a share of the period: a change of speed of a
 * fifth within a turn is more than a rotor with a flywheel's inertia does. */
#define TOLERANCE 0.2
#define TOLERANCE_LEAST                                                                            \
    0.05                    /* a pulse that comes by chance is then the mark's in one turn of ten */
#define TOLERANCE_SPREADS 5 /* standard deviations of what the rhythm itself does */
#define MEMORY 0.1          /* weight of the latest turn in the rhythm's own spread */

/* A rhythm of which about half is not there is a wrong one; a bridged gap of six turns reaches
 * 0.36. */
#define ABSENT_MOST 0.45
#define ABSENT_MEMORY 0.05

#define TURNS_TO_VOTE 8

/* How many times larger a pulse must be than its fellows: one of several marks that was made
 * different; and for a single mark the tape against a scratch, where sampling alone makes widths of
 * 4 and 5. */
#define RATIO_MARKS 1.15
#define RATIO_SCRATCH 1.2

void marks_init(struct marks *marks, int per_turn)
{
    memset(marks, 0, sizeof *marks);
    marks->per_turn = per_turn > 1 ? per_turn : 1;
    marks->quorum = MARKS_VOTERS;
    if (TURNS_TO_VOTE * (size_t)marks->per_turn > marks->quorum) {
        marks->quorum = TURNS_TO_VOTE * (size_t)marks->per_turn;
    }
    if (marks->quorum > MARKS_VOTERS_MOST) {
        marks->quorum = MARKS_VOTERS_MOST;
    }
    marks->reference = marks->per_turn == 1;
}

/* How many periods behind the last mark the pulse lies, 0 where it is on no mark's place. */
static long place(double since, double period, double tolerance)
{
    double turns = since / period;
    long n = lround(turns);
    double allowed = tolerance * (1 + 0.5 * (double)(n - 1)); /* the speed may have drifted on */

    return n >= 1 && fabs(turns - (double)n) <= fmin(TOLERANCE, allowed) ? n : 0;
}

/* Of several marks the one that is the zero must lead by this share of the voters, which are this
 * many. */
#define SURE 0.4
#define SURE_VOTERS 8
#define SURE_OF_TWO 12 /* of equal ones a choice at random is the same mark every other time */

struct ballot {
    double period, score, size, tolerance;
    double off; /* what its turns differ from the ones before, in half tolerances, added up */
    size_t start;
};

/* Of the pulses from i on that may be the same mark, the one nearest to where it is expected. */
static size_t nearest(const struct pulse *pulses, size_t count, size_t i, double last,
                      double period, double tolerance)
{
    long n = place(pulses[i].at - last, period, tolerance);
    double expected = last + (double)n * period;

    while (i + 1 < count && place(pulses[i + 1].at - last, period, tolerance) == n &&
           fabs(pulses[i + 1].at - expected) < fabs(pulses[i].at - expected)) {
        i++;
    }
    return i;
}

/* Follows the voters from `start` with a first period and counts how well that goes. */
static struct ballot follow(const struct pulse *pulses, size_t count, size_t start, double period,
                            double tolerance)
{
    struct ballot ballot = {period, -(double)start, 0, tolerance, 0, start};
    double last = pulses[start].at, current = period;
    size_t hits = 1;

    ballot.size = sieve_size(&pulses[start]);
    for (size_t i = start + 1; i < count; i++) {
        long n = place(pulses[i].at - last, current, tolerance);

        if (n == 0) {
            ballot.score -= 1;
            continue;
        }
        size_t best = nearest(pulses, count, i, last, current, tolerance);

        ballot.score += 1 - (double)(n - 1) - (double)(best - i);
        i = best;
        ballot.off += fabs((pulses[i].at - last) / current - (double)n) * 2 / TOLERANCE;
        current = 0.5 * current + 0.5 * (pulses[i].at - last) / (double)n;
        last = pulses[i].at;
        ballot.size += sieve_size(&pulses[i]);
        hits++;
    }
    ballot.size /= (double)hits;
    return ballot;
}

/* A first turn from a scratch to the mark may lie within the tolerance and still be none. */
static bool better(const struct ballot *a, const struct ballot *b)
{
    double lead = a->score - a->off - (b->score - b->off);

    if (fabs(lead) > 2) {
        return lead > 0;
    }
    return a->size > b->size * 1.02 || (a->size > b->size * 0.98 && lead > 0);
}

/* The best start and period that the voters have; false where no regular pulse is among them. */
static bool vote(const struct marks *marks, struct ballot *best)
{
    const struct pulse *p = marks->voters;
    size_t n = marks->voter_count;
    bool found = false;

    for (size_t start = 0; start < 6 && start + 1 < n; start++) {
        for (size_t next = start + 1; next < start + 4 && next < n; next++) {
            for (int k = 0; k < 2; k++) {
                struct ballot ballot =
                    follow(p, n, start, p[next].at - p[start].at, k ? TOLERANCE : TOLERANCE / 2);

                if (!found || better(&ballot, best)) {
                    *best = ballot;
                    found = true;
                }
            }
        }
    }
    if (!found) {
        return false;
    }
    if (marks->sieve.feature != SIEVE_OFF && marks->per_turn > 1) { /* a zero must be sure */
        size_t least = marks->per_turn == 2 ? SURE_OF_TWO : SURE_VOTERS;

        return n >= least && best->score > SURE * (double)n;
    }
    return n < 4 || best->score > -0.25 * (double)n;
}

/* True for every mark, or for one of the equal ones of a turn. */
static bool due(struct marks *marks)
{
    bool now = marks->reference || marks->slot == 0;

    marks->slot = (marks->slot + 1) % marks->per_turn;
    return now;
}

static size_t give(struct marks *marks, double at, long turns, struct mark *out)
{
    size_t n = 0;

    for (long k = 1; k < turns; k++) {
        double share = (double)k / (double)turns;

        if (due(marks)) {
            out[n++] = (struct mark){marks->last + share * (at - marks->last), false, false};
        }
        marks->missed++;
    }
    if (due(marks)) {
        out[n++] = (struct mark){at, true, marks->breaks};
        marks->breaks = false;
    }
    marks->count++;
    return n;
}

static double tolerance(const struct marks *marks)
{
    return fmin(TOLERANCE, fmax(TOLERANCE_LEAST, TOLERANCE_SPREADS * sqrt(marks->spread)));
}

/* The candidate becomes a mark. */
static size_t commit(struct marks *marks, struct mark *out)
{
    if (!marks->has_candidate) {
        return 0;
    }
    size_t n = give(marks, marks->candidate, marks->candidate_turns, out);

    double period = (marks->candidate - marks->last) / (double)marks->candidate_turns;
    double off = period / marks->period - 1;

    marks->spread += MEMORY * (off * off - marks->spread);
    for (long k = 1; k < marks->candidate_turns; k++) {
        marks->absent += ABSENT_MEMORY * (1 - marks->absent);
    }
    marks->absent -= ABSENT_MEMORY * marks->absent;
    marks->period = 0.5 * (marks->period + period);
    marks->last = marks->candidate;
    marks->has_candidate = false;
    marks->strays = 0;
    return n;
}

void marks_unlock(struct marks *marks)
{
    marks->locked = false;
    marks->breaks = true;
    marks->slot = 0;
    marks->voter_count = 0;
    sieve_restart(&marks->sieve); /* what lies between is no gap between marks */
}

/* One pulse, once the period is known. Sets *lost where the rhythm is gone; the pulse is then not
 * used. */
static size_t step(struct marks *marks, const struct pulse *pulse, struct mark *out, bool *lost)
{
    size_t given = 0;
    double since = pulse->at - marks->last;

    *lost = false;
    if (marks->has_candidate &&
        since > ((double)marks->candidate_turns + TOLERANCE) * marks->period) {
        given = commit(marks, out);
        since = pulse->at - marks->last;
    }
    long n = place(since, marks->period, tolerance(marks));

    if (marks->absent > ABSENT_MOST || since > (MARKS_GAP + 0.5) * marks->period ||
        (n == 0 && marks->strays > 8 && since > 3 * marks->period)) {
        *lost = true;
        return given;
    }
    if (n == 0) {
        marks->extra++;
        marks->strays++;
        return given;
    }
    double expected = marks->last + (double)n * marks->period;

    if (marks->has_candidate) {
        marks->extra++;
        marks->strays++;
        if (fabs(pulse->at - expected) >= fabs(marks->candidate - expected)) {
            return given;
        }
    }
    marks->has_candidate = true;
    marks->candidate = pulse->at;
    marks->candidate_turns = n;
    return given;
}

/* Keeps the voters that pass the sieve. */
static void sift_voters(struct marks *marks)
{
    size_t kept = 0;

    for (size_t i = 0; i < marks->voter_count; i++) {
        if (sieve_keeps(&marks->sieve, &marks->voters[i])) {
            marks->voters[kept++] = marks->voters[i];
        } else {
            marks->beside++;
        }
    }
    marks->voter_count = kept;
}

/* Tells the pulses apart, once, when enough of them have come; or leaves that to more of them,
 * where there is time to `wait`. */
static void sift(struct marks *marks, bool wait)
{
    bool several = marks->per_turn > 1, found = false;

    if (marks->sifted) {
        return;
    }
    marks->sieve.doubt = false;
    marks->sifted = true;
    if (several) {
        found = sieve_find(&marks->sieve, marks->voters, marks->voter_count, marks->per_turn,
                           RATIO_MARKS);
        marks->reference = found;
    } else {
        /* a scratch that comes once a turn, or two of them, beside the single mark */
        for (int pulses = 2; !found && pulses <= 3; pulses++) {
            found = sieve_find_large(&marks->sieve, marks->voters, marks->voter_count, pulses,
                                     RATIO_SCRATCH);
            marks->scratches = found ? pulses - 1 : 0;
        }
    }
    if (found) {
        sift_voters(marks);
    } else if (wait && marks->sieve.doubt && 2 * marks->quorum <= MARKS_VOTERS_MOST / 2) {
        marks->quorum *= 2;
        marks->sifted = false;
    }
}

long marks_extra(const struct marks *marks)
{
    long settling = marks->scratches + 2; /* pulses before the sieve has its means */
    long ordinary = marks->scratches * (marks->count + marks->missed) + settling;

    return marks->extra +
           (marks->per_turn == 1 && marks->beside > ordinary ? marks->beside - ordinary : 0);
}

/* The marks that did not come between two stretches, by the mean of their periods. */
static long lost_between(const struct marks *marks, double at, double period)
{
    double turns = (at - marks->last) / (0.5 * (marks->period + period));

    return turns >= 1.5 ? lround(turns) - 1 : 0;
}

/* Locks on with the voters and runs them through; keeps waiting where they are irregular. */
static size_t lock(struct marks *marks, bool wait, struct mark *out)
{
    struct ballot best;
    struct pulse voters[MARKS_VOTERS_MOST];

    sift(marks, wait);
    if (!marks->sifted) {
        return 0;
    }
    size_t given = 0, count = marks->voter_count;

    if (!vote(marks, &best)) {
        size_t drop = (count + 1) / 2;

        marks->extra += (long)drop;
        marks->voter_count -= drop;
        memmove(marks->voters, marks->voters + drop, marks->voter_count * sizeof *voters);
        return 0;
    }
    memcpy(voters, marks->voters, count * sizeof *voters);
    if (marks->breaks && marks->count > 0) {
        marks->between += lost_between(marks, voters[best.start].at, best.period);
    }
    marks->locked = true;
    marks->voter_count = 0;
    marks->extra += (long)best.start;
    marks->period = best.period;
    marks->spread = best.tolerance / TOLERANCE_SPREADS * (best.tolerance / TOLERANCE_SPREADS);
    marks->absent = 0;
    marks->has_candidate = false;
    marks->strays = 0;
    given = give(marks, voters[best.start].at, 1, out);
    marks->last = voters[best.start].at;
    for (size_t i = best.start + 1; i < count; i++) {
        bool lost;

        given += step(marks, &voters[i], out + given, &lost);
        if (lost) {
            marks_unlock(marks);
            marks->voter_count = count - i;
            memcpy(marks->voters, voters + i, marks->voter_count * sizeof *voters);
            break;
        }
    }
    return given;
}

size_t marks_push(struct marks *marks, const struct pulse *pulse, struct mark *out)
{
    size_t given = 0;

    if (marks->sifted && !sieve_keeps(&marks->sieve, pulse)) {
        marks->beside++;
        return 0;
    }
    if (marks->locked) {
        bool lost;

        given = step(marks, pulse, out, &lost);
        if (!lost) {
            return given;
        }
        marks_unlock(marks);
    }
    marks->voters[marks->voter_count++] = *pulse;
    if (marks->voter_count >= (marks->sifted ? MARKS_VOTERS : marks->quorum)) {
        given += lock(marks, true, out + given);
    }
    return given;
}

size_t marks_hurry(struct marks *marks, struct mark *out)
{
    return marks->locked || marks->voter_count < 4 ? 0 : lock(marks, false, out);
}

size_t marks_finish(struct marks *marks, struct mark *out)
{
    size_t given = 0;

    while (!marks->locked && marks->voter_count > 1) {
        given += lock(marks, false, out + given);
    }
    return marks->locked ? given + commit(marks, out + given) : given;
}
