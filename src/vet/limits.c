#include "vet/limits.h"

#include <math.h>
#include <string.h>

#define PRACTICE "common practice"

/* Defaults are common practice without a published source unless the basis names one. */
static const struct check_row defaults[CHECK_COUNT] = {
    [CHECK_READABLE] = {"readable", "", NAN, 0, +1, false, PRACTICE, "take the recording again"},
    [CHECK_SAME_RECORDING] = {"same-recording", "", NAN, 0, +1, false, PRACTICE,
                              "name the file that belongs to each run"},
    [CHECK_LENGTH] = {"length", "turns", 100, 20, -1, false, PRACTICE,
                      "record longer, so that the scatter shows"},
    [CHECK_SERVICE_SPEED] = {"service-speed", "%", 2, 10, +1, false, PRACTICE,
                             "run at service speed, or correct the sheet"},
    [CHECK_SPEED_STEADY] = {"speed-steady", "%", 1, 3, +1, false, PRACTICE,
                            "hold speed and load, and record again"},
    [CHECK_SPEED_MATCH] = {"speed-match", "%", 1, 3, +1, false, PRACTICE,
                           "responses change with speed: run all at the same speed"},
    [CHECK_AMPLITUDE_STEADY] = {"amplitude-steady", "%", 10, 30, +1, false, PRACTICE,
                                "look for changing load, looseness or a beat, and record again"},
    [CHECK_PHASE_STEADY] = {"phase-steady", "deg", 5, 20, +1, false,
                            "common practice; statistic after Mardia & Jupp 2000",
                            "check the tacho and its mark, and record again"},
    [CHECK_DRIFT] = {"drift", "%", 5, 20, +1, false, PRACTICE,
                     "let the machine settle until the vector stands, then record"},
    [CHECK_BEAT] = {"beat", "%", 10, 40, +1, false, PRACTICE,
                    "stop the neighbour that makes it, or record many of its periods"},
    [CHECK_ONE_X_SHARE] = {"one-x-share", "%", 50, NAN, -1, false, PRACTICE,
                           "most of the vibration is not 1x, and no weight will remove it: look "
                           "for its cause first"},
    [CHECK_TWO_X] = {"two-x", "%", 50, NAN, +1, false, PRACTICE,
                     "look at alignment and looseness before balancing"},
    [CHECK_HALF_ORDER] = {"half-order", "%", 50, NAN, +1, false, PRACTICE,
                          "look for looseness or a rub before balancing"},
    [CHECK_NEIGHBOUR] = {"neighbour", "%", 50, NAN, +1, false, PRACTICE,
                         "look for a machine nearby that makes it"},
    [CHECK_CLIPPING] = {"clipping", "samples", 1, 10, +1, false, PRACTICE,
                        "lower the gain or widen the range, and record again"},
    [CHECK_SENSOR_DEAD] = {"sensor-dead", "", NAN, 0, +1, false, PRACTICE,
                           "check sensor, cable and channel number"},
    [CHECK_TACHO] = {"tacho", "%", 1, 25, +1, false, PRACTICE,
                     "check the tacho's aim, its tape and the trigger level"},
    [CHECK_PHASE_REFERENCE] = {"phase-reference", "", NAN, 0, +1, false, PRACTICE,
                               "check the tacho's channel, and give it one mark that can be told apart"},
    [CHECK_REPEAT] = {"repeat", "%", 10, 30, +1, false, PRACTICE,
                      "find what changed between the runs, and repeat both"},
    [CHECK_TRIAL_EFFECT] = {"trial-effect", "s.e.", 30, 5, -1, false, PRACTICE,
                            "use a larger trial weight or another angle"},
    [CHECK_WEIGHT_FORCE] = {"weight-force", "%", 15, 50, +1, false, PRACTICE,
                            "use a smaller weight"},
    [CHECK_LOW_LEVEL] = {"low-level", "", 0, NAN, +1, false, PRACTICE,
                         "ask whether it needs balancing at all"},
};

static void override(struct check_row *row, const struct job_limit *limit, bool two_units)
{
    if (limit->off)
        row->off = true;
    if (!isnan(limit->caution))
        row->caution = limit->caution;
    if (!isnan(limit->refuse))
        row->refuse = limit->refuse;
    else if (!two_units && !isnan(limit->caution) && row->worse * (row->caution - row->refuse) > 0)
        row->refuse = row->caution;
}

void limits_init(struct limits *limits, const struct job *job)
{
    memcpy(limits->rows, defaults, sizeof defaults);
    for (size_t i = 0; i < job->limit_count; i++) {
        for (size_t c = 0; c < CHECK_COUNT; c++) {
            /* The trial's caution is in % and deg, its refusal in standard errors. */
            if (!strcmp(job->limits[i].check, defaults[c].name))
                override(&limits->rows[c], &job->limits[i], c == CHECK_TRIAL_EFFECT);
        }
    }
}

static bool trips(double value, double limit, int worse)
{
    if (isnan(limit))
        return false;
    return worse > 0 ? value >= limit && value > 0 : value < limit;
}

enum ruling limits_judge(const struct limits *limits, enum check check, double value,
                         double *crossed)
{
    const struct check_row *row = &limits->rows[check];

    *crossed = isnan(row->caution) ? row->refuse : row->caution;
    if (trips(value, row->refuse, row->worse)) {
        *crossed = row->refuse;
        return RULING_REFUSE;
    }
    return trips(value, row->caution, row->worse) ? RULING_CAUTION : RULING_OK;
}
