#include "vet_desk.h"

struct desk desk;

void vet_desk_reading(int run, int sensor, double complex vector)
{
    desk.readings[run][sensor] = (struct vet_reading){.present = true,
                                                      .has_phase = true,
                                                      .vector = vector,
                                                      .amplitude = cabs(vector),
                                                      .cov = {1e-10, 0, 1e-10},
                                                      .blocks = 30,
                                                      .speed_rpm = 1480,
                                                      .amplitude_pct = 1,
                                                      .phase_deg = 1,
                                                      .drift_pct = 0,
                                                      .independent = NAN,
                                                      .wander_pct = NAN,
                                                      .step_pct = NAN,
                                                      .step_s = NAN,
                                                      .resonance = {NAN, NAN},
                                                      .speed_pct = 0.1,
                                                      .turns = 600,
                                                      .overall_rms = NAN,
                                                      .overall_quantity = QUANTITY_VELOCITY,
                                                      .two_x = NAN,
                                                      .half_order = NAN,
                                                      .neighbour = NAN,
                                                      .neighbour_order = NAN,
                                                      .use = true,
                                                      .reason = -1};
}

void vet_desk_weight(int run, size_t plane, double mass, double angle_deg)
{
    desk.weights[run] = (struct job_weight){plane, mass, 0.4, mass, angle_deg, 0};
    desk.job_runs[run].weights = &desk.weights[run];
    desk.job_runs[run].weight_count = 1;
}

void vet_desk_set(void)
{
    static const char *const names[] = {"as-found", "trial A", "trial B", "trial A again"};

    findings_release(&desk.findings);
    memset(&desk, 0, sizeof desk);
    job_init(&desk.job);
    desk.job.rotor_mass = 340;
    desk.job.service_rpm = 1480;
    desk.job.sensors = desk.sensors;
    desk.job.sensor_count = SENSORS;
    desk.job.planes = desk.planes;
    desk.job.plane_count = 2;
    desk.job.runs = desk.job_runs;
    desk.job.run_count = RUNS;
    desk.job.aim.targets = desk.targets;
    desk.job.aim.repeatability = 0.03;
    for (int s = 0; s < SENSORS; s++) {
        strcpy(desk.sensors[s].name, s ? "NDE-H" : "DE-V");
        desk.sensors[s].quantity = desk.sensors[s].show.quantity = QUANTITY_VELOCITY;
        desk.targets[s] = (struct job_target){NAN, QUANTITY_VELOCITY, true};
    }
    desk.planes[0].radius_m = desk.planes[1].radius_m = 0.4;
    for (int r = 0; r < RUNS; r++) {
        desk.job_runs[r].speed_rpm = NAN;
        strcpy(desk.job_runs[r].name, names[r]);
        strcpy(desk.job_runs[r].condition, "service");
        strcpy(desk.items[r].name, names[r]);
        strcpy(desk.items[r].condition, "service");
        memset(desk.hashes[r][0], 'a' + r, 64);
        desk.items[r].index = r;
        desk.items[r].parent = -1;
        desk.items[r].has_tacho = desk.items[r].reference = true;
        desk.items[r].marks = 600;
        desk.items[r].hashes = desk.hashes[r];
        desk.items[r].hash_count = 1;
        desk.items[r].readings = desk.readings[r];
        desk.items[r].channels = desk.channels[r];
        desk.order[r] = (size_t)r;
        for (int s = 0; s < SENSORS; s++)
            desk.channels[r][s] = (struct vet_channel){true, -1, 1, 1e-4, 0, 100000, -1};
    }
    for (int s = 0; s < SENSORS; s++) {
        vet_desk_reading(0, s, 7e-3);
        vet_desk_reading(1, s, 4e-3 + 4e-3 * I);
        vet_desk_reading(2, s, 5e-3 - 5e-3 * I);
        vet_desk_reading(3, s, 4.05e-3 + 4e-3 * I);
    }
    vet_desk_weight(1, 0, 0.02, 30);
    vet_desk_weight(2, 1, 0.02, 60);
    vet_desk_weight(3, 0, 0.02, 30);
    desk.runs = (struct vet_runs){desk.items, RUNS, RUNS};
    limits_init(&desk.limits, &desk.job);
    findings_init(&desk.findings, &desk.limits);
}

/* The worst ruling of a check about a run and a sensor (-1: any); -1 where it found nothing. */
int vet_desk_ruled(enum check check, int run, int sensor)
{
    int worst = -1;

    for (size_t i = 0; i < desk.findings.count; i++) {
        const struct finding *f = &desk.findings.items[i];
        if (f->check == check && (run < -1 || f->run == run) &&
            (sensor < 0 || f->sensor == sensor) && (int)f->ruling > worst)
            worst = (int)f->ruling;
    }
    return worst;
}

void vet_desk_within(int run)
{
    findings_clear(&desk.findings);
    within_run(&desk.items[run], run, &desk.job, &desk.findings);
}

void vet_desk_vectors(int run)
{
    double as_found[SENSORS];

    findings_clear(&desk.findings);
    for (size_t s = 0; s < SENSORS; s++)
        as_found[s] = across_as_found(&desk.runs, desk.order, &desk.job, "service", s);
    within_vectors(&desk.items[run], run, as_found, &desk.job, &desk.findings);
}

bool vet_desk_any_used(int run)
{
    return desk.readings[run][0].use || desk.readings[run][1].use;
}

bool vet_desk_all_used(int run)
{
    return desk.readings[run][0].use && desk.readings[run][1].use;
}

void vet_desk_figure(enum check check, double value)
{
    for (int s = 0; s < SENSORS; s++) {
        struct vet_reading *r = &desk.readings[1][s];
        switch (check) {
        case CHECK_LENGTH:
            r->turns = (long)value;
            break;
        case CHECK_SERVICE_SPEED:
            r->speed_rpm = 1480 * (1 + value / 100);
            break;
        case CHECK_SPEED_STEADY:
            r->speed_pct = value;
            break;
        case CHECK_AMPLITUDE_STEADY: /* the as-found amplitude is 7, the reading's 5.657 */
            r->amplitude_pct = value * 7e-3 / r->amplitude;
            break;
        case CHECK_PHASE_STEADY:
            r->phase_deg = value;
            break;
        case CHECK_DRIFT:
            r->drift_pct = value * 7e-3 / r->amplitude;
            break;
        case CHECK_CLIPPING:
            desk.channels[1][s].railed = (long long)value;
            break;
        case CHECK_TACHO:
            desk.items[1].missed = lround(value * 3);
            desk.items[1].extra = lround(value * 3);
            desk.items[1].marks = 600 - desk.items[1].missed;
            break;
        case CHECK_WEIGHT_FORCE: /* m r w^2 against half of 340 kg * 9.80665 m/s2 */
            desk.weights[1].mounted_mass =
                value / 100 * 340 * 9.80665 / 2 / 0.4 / pow(2 * 3.14159265358979 * 1480 / 60, 2);
            break;
        default:
            fail();
        }
    }
}
