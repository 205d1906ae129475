/* facts.h - what the checks look at: the runs that were seen, and their readings. */
#ifndef LOPSIDE_VET_FACTS_H
#define LOPSIDE_VET_FACTS_H

#include <complex.h>
#include <stdbool.h>
#include <stddef.h>

#include "stream/job.h"
#include "vet/beat.h"
#include "vet/orders.h"
#include "vet/resonance.h"

struct vet_reading { /* percentages of the reading's own amplitude; NaN: not known */
    bool present, has_phase;
    double complex vector; /* SI peak, argument is lag */
    double amplitude;      /* SI peak */
    double cov[3];         /* of the mean: var re, cov, var im */
    long blocks;           /* 0: by hand */
    double speed_rpm;
    double amplitude_pct, phase_deg, drift_pct, speed_pct;
    long set_aside, turns;
    double independent;      /* of the blocks, as many as really were */
    double wander_pct;       /* of the mean, slow; part of amplitude_pct and phase_deg */
    double step_pct, step_s; /* largest lasting jump of the mean, and when */
    double overall_rms;      /* SI of overall_quantity */
    enum quantity overall_quantity;
    double two_x, half_order, neighbour; /* % of 1x in the quantity shown; NaN: no spectrum */
    double neighbour_order;
    double lines[ORDERS_LINES_MOST][2]; /* Hz, SI peak: what does not turn with the shaft */
    size_t line_count;
    struct beat beat; /* swing in SI; NaN: too few blocks */
    struct resonance resonance;
    bool use;   /* the ruling */
    int reason; /* the first check that refused it; -1: none */
    double widen[3];
    double by_speed; /* of widen, both components: for speeds that differ between runs */
};

struct vet_channel {
    bool present;
    double min, max, resolution; /* SI */
    long long railed, samples;
    int same_as; /* sensor index; -1 none; -2 the tacho */
};

struct vet_run {
    char name[NAME_ROOM], condition[NAME_ROOM];
    int index;  /* in the job's runs; -1: a recording of an audit */
    int parent; /* position of the coast-down whose readings at one speed these are; -1: none */
    long turns_seen;    /* in all blocks */
    bool hand;          /* read by hand: nothing within the run can be checked */
    bool unreadable;    /* `read` said so */
    bool refused;       /* as a whole */
    char (*hashes)[65]; /* owned: SHA-256 of its files */
    size_t hash_count;
    bool has_tacho, reference;
    bool pulses; /* of the tacho; false: its signal looks like vibration */
    long marks, missed, extra;
    double jitter_deg, tacho_rpm; /* of the tacho's marks; NaN: not known */
    struct vet_reading *readings; /* owned, one per sensor */
    struct vet_channel *channels; /* owned, one per sensor */
};

/* A run or a set of them in the order in which they were seen. */
struct vet_runs {
    struct vet_run *items; /* owned */
    size_t count, room;
};

/* Adds a run, all its readings absent; its position, or -1: no memory. Pointers into `items` do not
 * outlive it. */
int facts_add(struct vet_runs *runs, size_t sensor_count) __attribute__((warn_unused_result));

/* The position of the run that holds the readings of `condition` in the run at `parent`: itself, or
 * one made for it the first time (a coast-down has readings at several speeds); -1: no memory. */
int facts_at_condition(struct vet_runs *runs, int parent, const char *condition,
                       size_t sensor_count) __attribute__((warn_unused_result));

/* Takes readings of the conditions of the run at `parent` out of use where its own are. */
void facts_hand_down(struct vet_runs *runs, int parent, size_t sensor_count);

/* How many marks a turn the sheet should give its tacho for the run's speed to be the service
 * speed: where one is a whole multiple of the other (2 to 8, within 5 %); 0: nothing of the kind.
 */
int facts_marks(const struct vet_run *run, const struct job *job);

void facts_release(struct vet_runs *runs); /* frees what it owns */

/* A run's role in its job: "" for an ordinary run, for what a coast-down gave at one speed, and for
 * a recording of an audit. */
const char *facts_role(const struct vet_run *run, const struct job *job);

/* The run's speed, rpm: of its first reading; NaN for none. `used`: of the first that is in use. */
double facts_speed(const struct vet_run *run, const struct job *job, bool used);

#endif
