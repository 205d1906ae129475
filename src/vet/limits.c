#include "vet/limits.h"

#include <math.h>
#include <string.h>

#define PRACTICE "common practice"
#define MISFIT "common practice; chi-squared of the misfit, points after Wilson & Hilferty 1931"

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
                                "usual suspects: changing load, looseness, a beat; record again"},
    [CHECK_PHASE_STEADY] = {"phase-steady", "deg", 5, 20, +1, false,
                            "common practice; statistic after Mardia & Jupp 2000",
                            "check the tacho and its mark, and record again"},
    [CHECK_DRIFT] = {"drift", "%", 5, 20, +1, false, PRACTICE,
                     "usual suspects: warming up, changing load, build-up; let the vector settle, "
                     "then record"},
    [CHECK_BEAT] = {"beat", "%", 10, 40, +1, false, PRACTICE,
                    "stop the neighbour that makes it, or record many of its periods"},
    [CHECK_ONE_X_SHARE] = {"one-x-share", "%", 50, NAN, -1, false, PRACTICE,
                           "no weight will remove what is not 1x; usual suspects: "
                           "misalignment, looseness, bearings, flow, a neighbour"},
    [CHECK_TWO_X] = {"two-x", "%", 50, NAN, +1, false, PRACTICE,
                     "usual suspects: misalignment, looseness, a bent shaft; look there before "
                     "balancing"},
    [CHECK_HALF_ORDER] = {"half-order", "%", 50, NAN, +1, false, PRACTICE,
                          "usual suspects: looseness, a rub, a belt; look there before balancing"},
    [CHECK_NEIGHBOUR] = {"neighbour", "%", 50, NAN, +1, false, PRACTICE,
                         "usual suspects: a machine nearby, a belt, a bearing"},
    [CHECK_CLIPPING] = {"clipping", "samples", 1, 10, +1, false, PRACTICE,
                        "lower the gain or widen the range, and record again"},
    [CHECK_SENSOR_DEAD] = {"sensor-dead", "", NAN, 0, +1, false, PRACTICE,
                           "check sensor, cable and channel number"},
    [CHECK_TACHO] = {"tacho", "%", 1, 25, +1, false, PRACTICE,
                     "check the tacho's aim, its tape and the trigger level"},
    [CHECK_PHASE_REFERENCE] =
        {"phase-reference", "", NAN, 0, +1, false, PRACTICE,
         "check the tacho's channel, and give it one mark that can be told apart"},
    [CHECK_REPEAT] = {"repeat", "%", 10, 30, +1, false, PRACTICE,
                      "find what changed between the runs, and repeat both"},
    [CHECK_TRIAL_EFFECT] = {"trial-effect", "s.e.", 30, 5, -1, false, PRACTICE,
                            "use a larger trial weight or another angle"},
    [CHECK_WEIGHT_FORCE] = {"weight-force", "%", 15, 50, +1, false, PRACTICE,
                            "use a smaller weight, if its effect still shows"},
    [CHECK_TAPE_MOVED] = {"tape-moved", "", 3, NAN, +1, false, MISFIT,
                          "look whether tape, tacho or its edge was moved, and run anew with them "
                          "as they are now"},
    [CHECK_SENSOR_SWAPPED] = {"sensor-swapped", "", 3, NAN, +1, false, MISFIT,
                              "follow both cables; the sheet can give a run its channels"},
    [CHECK_SENSOR_TURNED] = {"sensor-turned", "", 3, NAN, +1, false, MISFIT,
                             "look at its mounting, side and polarity, and run anew"},
    [CHECK_NEAR_RESONANCE] = {"near-resonance", "deg", 5, NAN, +1, false, PRACTICE,
                              "usual suspect: a resonance near this speed; hold the speed closely "
                              "in all runs, or balance at another one"},
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
