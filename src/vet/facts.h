/* facts.h - what the checks look at: the runs that were seen, and their readings. */
#ifndef LOPSIDE_VET_FACTS_H
#define LOPSIDE_VET_FACTS_H

#include <complex.h>
#include <stdbool.h>
#include <stddef.h>

#include "stream/job.h"
#include "vet/beat.h"

struct vet_reading { /* percentages of the reading's own amplitude; NaN: not known */
    bool present, has_phase;
    double complex vector; /* SI peak, argument is lag */
    double amplitude;      /* SI peak */
    double cov[3];         /* of the mean: var re, cov, var im */
    long blocks;           /* 0: by hand */
    double speed_rpm;
    double amplitude_pct, phase_deg, drift_pct, speed_pct;
    long set_aside, turns;
    double overall_rms; /* SI of overall_quantity */
    enum quantity overall_quantity;
    double two_x, half_order, neighbour; /* % of 1x in the quantity shown; NaN: no spectrum */
    double neighbour_order;
    struct beat beat; /* swing in SI; NaN: too few blocks */
    bool use;         /* the ruling */
    int reason;       /* the first check that refused it; -1: none */
    double widen[3];
};

struct vet_channel {
    bool present;
    double min, max, resolution; /* SI */
    long long railed, samples;
    int same_as; /* sensor index; -1 none; -2 the tacho */
};

struct vet_run {
    char name[NAME_ROOM], condition[NAME_ROOM];
    int index;          /* in the job's runs; -1: a recording of an audit */
    bool hand;          /* read by hand: nothing within the run can be checked */
    bool unreadable;    /* `read` said so */
    bool refused;       /* as a whole */
    char (*hashes)[65]; /* owned: SHA-256 of its files */
    size_t hash_count;
    bool has_tacho, reference;
    bool pulses;        /* of the tacho; false: its signal looks like vibration */
    long marks, missed, extra;
    struct vet_reading *readings; /* owned, one per sensor */
    struct vet_channel *channels; /* owned, one per sensor */
};

/* A run or a set of them in the order in which they were seen. */
struct vet_runs {
    struct vet_run *items; /* owned */
    size_t count, room;
};

#endif
