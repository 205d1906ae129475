#include "desk/check.h"

#include <complex.h>
#include <math.h>
#include <stdint.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>
#include <unistd.h>

#include "base/message.h"
#include "base/options.h"
#include "base/status.h"
#include "desk/look.h"
#include "desk/wish.h"
#include "report/shown.h"
#include "sheet/sheet.h"
#include "sheet/units.h"
#include "vet/within.h"

/* Common practice: no machine that runs shakes more, and none is as still. A wrong scale or full
 * scale does that. */
#define VELOCITY_MOST 0.2    /* m/s rms at 1x */
#define VELOCITY_LEAST 1e-5  /* m/s rms at 1x */
#define ACCELERATION_MOST 49 /* m/s2 rms at 1x: 5 g */
#define SPEED_OFF 0.1        /* the refusal of vet's check `service-speed` */

#define TURNS_LEAST 20 /* the refusal of vet's check `length` */
#define FORCE_MUCH                                                                                 \
    15                /* % of the static journal load: the caution of vet's check `weight-force`   \
                       */
#define FORCE_MOST 50 /* its refusal */
#define PULSES_OFF                                                                                 \
    0.1               /* pulses a turn are a whole number, nearer than the speeds' own tolerance   \
                       */
#define PULSES_MOST 8 /* of more it would be guessed */

struct content {     /* a file that was looked at */
    const char *run; /* borrowed: the run's name, or the recording's path */
    char sha256[65];
};

struct checkup {
    struct sheet sheet;
    struct content *contents; /* owned */
    size_t content_count;
    long remarks;
    const char *mark, *plain; /* what begins and ends a remark on a terminal; else empty */
    int status;               /* the first failure */
};

/* ---- words ---- */

/* A text of the user's: no control character reaches a terminal. Padded to `width` characters. */
static void print_text(const char *text, int width)
{
    for (const char *c = text; *c; c++) {
        putchar((unsigned char)*c < 0x20 || *c == 0x7F ? '?' : *c);
        width -= ((unsigned char)*c & 0xC0) != 0x80;
    }
    printf("%*s", width > 0 ? width : 0, "");
}

static void begin_remark(struct checkup *check, const char *name)
{
    printf("    %s! ", check->mark);
    print_text(name, 0);
    fputs(": ", stdout);
    check->remarks++;
}

static void end_remark(const struct checkup *check)
{
    printf("%s\n", check->plain);
}

/* In what people read a column: the unit that its sensor is shown in, or, where that is of another
 * quantity, the one that the sheet says it measures in. */
static struct show unit_of(const struct sheet *sheet, int sensor)
{
    static const char *const units[] = {"g", "m/s2", "mm/s", "in/s", "um", "mil", NULL};
    struct show show = {.unit = "", .si = 1};
    if (sensor < 0)
        return show;
    const struct job_sensor *s = &sheet->job.sensors[sensor];
    if (s->show.quantity == s->quantity)
        return s->show;
    for (size_t i = 0; units[i]; i++)
        if (units_vibration(units[i], &show) && show.quantity == s->quantity &&
            show.si == sheet->scales[sensor].si_per_unit)
            return show;
    return (struct show){.unit = "", .si = 1};
}

/* ---- one run ---- */

static void remark_signal(struct checkup *check, const struct look *look, size_t c,
                          const char *name, bool tacho, const struct recording_column *columns)
{
    const struct look_column *column = &look->columns[c];
    if (!(column->resolution > 0)) {
        begin_remark(check, name);
        fputs("no signal, it never changes", stdout);
        end_remark(check);
    } else if (column->railed > 0 && !tacho) { /* pulses that are cut off are no worse */
        begin_remark(check, name);
        printf("%lld of %lld samples at full scale or held at an extreme", column->railed,
               look->seen);
        end_remark(check);
    }
    if (column->same_as >= 0) {
        begin_remark(check, name);
        fputs("the same signal as '", stdout);
        print_text(columns[column->same_as].name, 0);
        putchar('\'');
        end_remark(check);
    }
}

static void remark_tacho(struct checkup *check, const struct look_column *column)
{
    const double service = check->sheet.job.service_rpm;
    if (!column->pulses) {
        begin_remark(check, "tacho");
        fputs("no regular pulses seen", stdout);
        end_remark(check);
    } else if (!column->reference) {
        begin_remark(check, "tacho");
        fputs("pulses that cannot be told apart: a speed, but no phase", stdout);
        end_remark(check);
    }
    if (column->pulses && fabs(column->speed_rpm / service - 1) > SPEED_OFF) {
        const int marks = check->sheet.job.tacho_marks;
        const double pulses = marks * column->speed_rpm / service, whole = round(pulses);
        begin_remark(check, "tacho");
        printf("%.0f rpm, and the service speed is %.0f rpm", column->speed_rpm, service);
        if (fabs(pulses - whole) < PULSES_OFF && whole >= 1 && whole <= PULSES_MOST)
            printf(": with %.0f pulse%s a turn it would be 'marks = %.0f' in [tacho]", whole,
                   whole > 1 ? "s" : "", whole);
        end_remark(check);
    }
}

static void remark_length(struct checkup *check, const struct look *look, double rpm)
{
    const double turns = (double)look->frames / look->rate_hz * rpm / 60;
    if (!(turns < TURNS_LEAST))
        return;
    begin_remark(check, "length");
    printf("%.0f turns, fewer than %d carry no reading: record longer", floor(turns), TURNS_LEAST);
    end_remark(check);
}

/* A file that another run has, too: one of them names the wrong one. 0, or -1 when memory is out.
 */
static int remark_content(struct checkup *check, const struct look *look, const char *run)
{
    struct content *contents = realloc(check->contents, (check->content_count + look->file_count) *
                                                            sizeof *check->contents);
    if (!contents)
        return -1;
    check->contents = contents;
    for (size_t f = 0; f < look->file_count; f++) {
        for (size_t i = 0; i < check->content_count; i++)
            if (strcmp(contents[i].run, run) && !strcmp(contents[i].sha256, look->sha256[f])) {
                begin_remark(check, "file");
                fputs("the same content as in '", stdout);
                print_text(contents[i].run, 0);
                fputs("', to the byte", stdout);
                end_remark(check);
                break;
            }
        contents[check->content_count].run = run;
        memcpy(contents[check->content_count++].sha256, look->sha256[f], sizeof contents->sha256);
    }
    return 0;
}

static void print_column(const struct checkup *check, const struct wish *wish,
                         const struct look *look, size_t c)
{
    const struct look_column *column = &look->columns[c];
    const struct show unit = unit_of(&check->sheet, wish->sensors[c]);
    const bool volts = wish->sensors[c] < 0 && !isnan(column->rail);
    fputs("    ", stdout);
    print_text(wish->columns[c].name, 16);
    putchar(' ');
    print_text(wish->columns[c].channel, 12);
    printf(" %10.3g %10.3g", column->min / unit.si, column->max / unit.si);
    if (isnan(column->rail))
        printf(" %10s", "-");
    else
        printf(" %10.3g", column->rail / unit.si);
    printf(" %s", volts ? "V" : unit.unit);
    if (wish->sensors[c] < 0 && column->pulses)
        printf("%s%.1f rpm", volts ? ", " : "", column->speed_rpm);
    putchar('\n');
}

/* 1x of each sensor as it is shown. */
static void print_once(const struct checkup *check, const struct wish *wish,
                       const struct look *look, double speed)
{
    bool begun = false;
    for (size_t c = 0; c < look->count; c++) {
        if (wish->sensors[c] < 0 || !(look->columns[c].once > 0))
            continue;
        const struct job_sensor *sensor = &check->sheet.job.sensors[wish->sensors[c]];
        char unit[24];
        const double peak = cabs(
            units_convert(look->columns[c].once, sensor->quantity, sensor->show.quantity, speed));
        fputs(begun ? ", " : "    1x: ", stdout);
        print_text(sensor->name, 0);
        printf(" %.3g %s", units_shown(peak, &sensor->show), units_show_text(&sensor->show, unit));
        begun = true;
    }
    if (begun)
        putchar('\n');
}

/* `still` may be right: at slow roll. */
static void remark_once(struct checkup *check, const struct wish *wish, const struct look *look,
                        double speed, bool still)
{
    for (size_t c = 0; c < look->count; c++) {
        const struct look_column *column = &look->columns[c];
        if (wish->sensors[c] < 0 || !(column->resolution > 0) || isnan(column->once))
            continue;
        const enum quantity from = check->sheet.job.sensors[wish->sensors[c]].quantity;
        const double velocity =
            cabs(units_convert(column->once, from, QUANTITY_VELOCITY, speed)) / sqrt(2);
        const bool much = velocity > VELOCITY_MOST || velocity * speed > ACCELERATION_MOST;
        if (!much && (still || velocity >= VELOCITY_LEAST))
            continue;
        begin_remark(check, wish->columns[c].name);
        printf("implausibly %s at 1x, %.2g mm/s rms or %.2g g rms: check scale and full scale",
               much ? "large" : "small", velocity * 1e3, velocity * speed / 9.80665);
        end_remark(check);
    }
}

static void print_look(struct checkup *check, const struct wish *wish, const struct look *look,
                       const char *role)
{
    printf("  %.4g s at %.6g Hz", (double)look->frames / look->rate_hz, look->rate_hz);
    if (look->seen < look->frames)
        printf(", of which the first %.4g s are shown", (double)look->seen / look->rate_hz);
    printf("\n    %-16s %-12s %10s %10s %10s\n", "column", "channel", "lowest", "highest",
           "full scale");
    for (size_t c = 0; c < look->count; c++)
        print_column(check, wish, look, c);
    for (size_t c = 0; c < look->count; c++)
        remark_signal(check, look, c, wish->columns[c].name, wish->tacho == (int)c, wish->columns);
    if (wish->tacho < 0)
        return;
    remark_tacho(check, &look->columns[wish->tacho]);
    const double speed = look->columns[wish->tacho].speed_rpm * 2 * acos(-1) / 60; /* rad/s */
    if (!(speed > 0) || !strcmp(role, "coast-down")) /* there is no one amplitude */
        return;
    remark_length(check, look, look->columns[wish->tacho].speed_rpm);
    print_once(check, wish, look, speed);
    remark_once(check, wish, look, speed, role[0] != '\0');
}

/* All that is mounted in a run, as the sheet counts angles. */
static void print_weights(const struct job *job, const struct job_run *run)
{
    const bool us = job->units == UNITS_US;
    for (size_t i = 0; i < run->weight_count; i++) {
        const struct job_weight *w = &run->weights[i];
        fputs("  weight ", stdout);
        print_text(job->planes[w->plane].name, 0);
        printf(": %.4g %s at %.4g deg %s",
               w->mounted_mass / units_factor(DIMENSION_MASS, us ? "oz" : "g"), us ? "oz" : "g",
               job_sheet_angle(job, w->angle_deg), job_sense_text(job));
        if (w->position > 0)
            printf(", position %d", w->position);
        if (w->radius_m != job->planes[w->plane].radius_m)
            printf(", radius %.4g %s",
                   w->radius_m / units_factor(DIMENSION_LENGTH, us ? "in" : "mm"),
                   us ? "in" : "mm");
        putchar('\n');
    }
}

static bool is_runout(const struct job_run *run)
{
    return strcmp(run->role, "runout") == 0;
}

/* A slow roll is taken off displacement probes, whatever is mounted in it. */
static void remark_runout(struct checkup *check, const struct job_run *run)
{
    const struct job *job = &check->sheet.job;
    size_t probes = 0;
    for (size_t i = 0; i < job->sensor_count; i++)
        probes += job->sensors[i].quantity == QUANTITY_DISPLACEMENT && !run->without[i];
    if (!is_runout(run))
        return;
    if (probes == 0) {
        begin_remark(check, "role");
        fputs("a slow roll (runout) has no effect without a displacement probe", stdout);
        end_remark(check);
    }
    if (run->weight_count > 0) {
        begin_remark(check, "weights");
        fputs("what is mounted at a slow roll (runout) is not counted: no weight pulls there",
              stdout);
        end_remark(check);
    }
}

/* The weights' force at service speed against what the journals carry at rest. */
static void remark_force(struct checkup *check, const struct job_run *run)
{
    const struct job *job = &check->sheet.job;
    const double force = within_force(run, job, job->service_rpm);
    const double share = 100 * force / within_journal_load(job);
    if (is_runout(run) || !(share > FORCE_MUCH))
        return;
    begin_remark(check, "weights");
    char text[2 * DIGITS_ROOM];
    printf("they pull with %s at %.0f rpm, %.2g %% of the static journal load, %s",
           shown_force(job, text, force), job->service_rpm, share,
           share > FORCE_MOST ? "more than 50 % is refused: a smaller weight, or is a unit wrong?"
                              : "more than 15 % is much for a trial: is every unit right?");
    end_remark(check);
}

static void remark_found(struct checkup *check, size_t run)
{
    if (job_found_loaded(&check->sheet.job) != (int)run)
        return;
    begin_remark(check, "as found");
    fputs("this run carries weights: as found is taken as the rotor without them; leave out what "
          "was on before the job began",
          stdout);
    end_remark(check);
}

static void print_run_head(struct checkup *check, size_t run, const char *path)
{
    if (path) {
        fputs("\nrecording '", stdout);
        print_text(path, 0);
        puts("'");
        return;
    }
    fputs("\nrun '", stdout);
    print_text(check->sheet.job.runs[run].name, 0);
    putchar('\'');
    for (size_t f = 0; f < check->sheet.runs[run].file_count; f++) {
        fputs(f ? ", " : ": ", stdout);
        print_text(check->sheet.runs[run].files[f], 0);
    }
    fputs(check->sheet.job.runs[run].hand_count > 0 ? ": by hand" : "", stdout);
    puts(is_runout(&check->sheet.job.runs[run]) ? "; slow roll (runout)" : "");
    print_weights(&check->sheet.job, &check->sheet.job.runs[run]);
    remark_found(check, run);
    remark_force(check, &check->sheet.job.runs[run]);
    remark_runout(check, &check->sheet.job.runs[run]);
}

/* Run `run` of the sheet, or the recording `path`. A failure is noted, and the next is looked at.
 */
static void check_run(struct checkup *check, size_t run, const char *path)
{
    const struct job *job = &check->sheet.job;
    struct fault fault = {0};
    struct wish wish;
    struct look look = {0};
    print_run_head(check, run, path);
    if (!path && check->sheet.runs[run].file_count == 0)
        return;
    if (wish_init(&wish, &check->sheet, run, path) != 0)
        fault_no_memory(&fault);
    else if (wish.recording.column_count == 0)
        fault_set(&fault, STATUS_USAGE, "no sensor and no tacho is on: '%s'", wish.paths[0]);
    const struct look_tacho tacho = {.column = wish.tacho,
                                     .edge = job->tacho_edge,
                                     .marks = job->tacho_marks,
                                     .level = job->tacho_level,
                                     .service_rpm = job->service_rpm};
    if (fault.status == STATUS_DONE &&
        look_at(&look, &wish.recording, &tacho, &fault) == STATUS_DONE) {
        print_look(check, &wish, &look, path ? "" : job->runs[run].role);
        if (remark_content(check, &look, path ? path : job->runs[run].name) != 0)
            fault_no_memory(&fault);
    }
    fflush(stdout); /* what is said stands behind the run's head */
    if (fault.status != STATUS_DONE) {
        if (path || fault.status == STATUS_SYSTEM)
            message("%s", fault.text);
        else
            message("%s (run '%s' of '%s')", fault.text, job->runs[run].name, check->sheet.path);
        puts(fault.status == STATUS_USAGE ? "  the sheet does not suit it" : "  cannot be read");
        check->status = check->status == STATUS_DONE ? fault.status : check->status;
    }
    look_release(&look);
    wish_release(&wish);
}

/* ---- the sheet ---- */

static int read_sheet(struct checkup *check, const char *path, bool audit)
{
    struct buffer errors = BUFFER_INIT;
    int count = sheet_read(&check->sheet, path, audit, &errors);
    int status = count == 0 ? STATUS_DONE : count > 0 ? STATUS_USAGE : message_no_memory();
    for (char *line = errors.bytes; count > 0 && line && *line;) {
        char *end = strchr(line, '\n');
        if (end)
            *end = '\0';
        message("%s", line);
        line = end ? end + 1 : NULL;
    }
    buffer_release(&errors);
    return status;
}

static void print_count(size_t count, const char *what)
{
    printf(", %zu %s%s", count, what, count == 1 ? "" : "s");
}

static void print_sheet(const struct checkup *check)
{
    const struct job *job = &check->sheet.job;
    print_text(job->title, 0);
    fputs("\n  ", stdout);
    print_text(check->sheet.path, 0);
    fputs(": no mistake in the sheet", stdout);
    print_count(job->sensor_count, "sensor");
    print_count(job->plane_count, "plane");
    print_count(job->run_count, "run");
    puts(job->has_tacho ? "" : ", no tacho");
}

static void remark_weights(struct checkup *check)
{
    const char *plane = wish_lacks_weight(&check->sheet.job);
    if (!plane)
        return;
    begin_remark(check, "weights");
    fputs("no run says what was mounted: add 'weight ", stdout);
    print_text(plane, 0);
    fputs(" = ... at ...' to the trial run's section", stdout);
    end_remark(check);
}

/* No weight may be placed without its force in sight. */
static void remark_speed(struct checkup *check)
{
    const struct job *job = &check->sheet.job;
    if (job->plane_count == 0 || job->service_rpm > 0)
        return;
    begin_remark(check, "rotor");
    fputs("without 'service speed' in [rotor] no weight's force can be told", stdout);
    end_remark(check);
}

static void remark_never_bare(struct checkup *check)
{
    begin_remark(check, "as found");
    fputs("every run carries weights: as found is taken as the rotor without any of them, which no "
          "run shows",
          stdout);
    end_remark(check);
}

static void use_colour(struct checkup *check)
{
    const char *no = getenv("NO_COLOR"), *term = getenv("TERM");
    const bool colour = isatty(STDOUT_FILENO) && !(no && *no) && term && strcmp(term, "dumb") != 0;
    check->mark = colour ? "\033[1m" : "";
    check->plain = colour ? "\033[0m" : "";
}

int desk_check(int argc, char **argv)
{
    static const struct option options[] = {{.name = NULL}};
    static const struct usage usage = {
        "check",
        "SHEET [RECORDING...]",
        "is the sheet right, are its files there, what is on their channels?",
        options,
        1,
        SIZE_MAX,
        "Shows rate, length, range and the tacho of every run, from the first 20 s of it.\n"
        "With recordings, these are looked at in the place of the sheet's runs."};
    struct option_list operands;
    struct checkup check = {.status = STATUS_DONE};
    int parsed = options_parse(&usage, argc, argv, &operands);
    int status = parsed == OPTIONS_MISUSE ? STATUS_USAGE : STATUS_DONE;
    if (parsed == OPTIONS_GO)
        status = read_sheet(&check, operands.items[0], operands.count > 1);
    if (parsed == OPTIONS_GO && status == STATUS_DONE) {
        use_colour(&check);
        print_sheet(&check);
        if (operands.count == 1)
            remark_weights(&check);
        if (operands.count == 1)
            remark_speed(&check);
        if (operands.count == 1 && job_never_bare(&check.sheet.job))
            remark_never_bare(&check);
        for (size_t i = 1; i < operands.count; i++)
            check_run(&check, 0, operands.items[i]);
        for (size_t i = 0; operands.count == 1 && i < check.sheet.job.run_count; i++)
            check_run(&check, i, NULL);
        printf("\n%ld remark%s\n", check.remarks, check.remarks == 1 ? "" : "s");
        status = check.status;
    }
    free(check.contents);
    sheet_release(&check.sheet);
    option_list_release(&operands);
    return status;
}
