#include <math.h>
#include <stdio.h>
#include <string.h>

#include "base/angle.h"
#include "report/draw.h"
#include "report/phrase.h"
#include "report/shown.h"
#include "report/text_answer.h"

#define WIDE 400.0
#define HIGH 450.0
#define MIDDLE_X 200.0
#define MIDDLE_Y 195.0
#define DISC 130.0  /* the circle of the positions */
#define INSIDE 96.0 /* where masses are written */
#define OUTSIDE 156.0

/* +1 where a positive angle against rotation runs clockwise on the paper. */
static int clockwise(const struct job *job)
{
    return job->turning == TURNING_COUNTER_CLOCKWISE ? 1 : -1;
}

struct svg_point draw_plane_at(const struct job *job, double x, double y, double r,
                               double angle_deg)
{
    double turned = clockwise(job) * angle_deg * PI / 180;
    return (struct svg_point){x + r * sin(turned), y - r * cos(turned)};
}

static struct svg_point at(const struct job *job, double r, double angle_deg)
{
    return draw_plane_at(job, MIDDLE_X, MIDDLE_Y, r, angle_deg);
}

/* The arrow runs with rotation: along falling angles against rotation. */
static void arrow(const struct job *job, struct buffer *out)
{
    struct svg_point arc[21];
    if (job->turning == TURNING_NONE)
        return;
    for (int i = 0; i <= 20; i++)
        arc[i] = at(job, 62, 60 - 6 * i);
    buffer_text(out, "<g data-what=\"rotation\">");
    svg_path(out, "arrow", arc, 21, 0);
    struct svg_point head[3] = {at(job, 69, -55), at(job, 62, -74), at(job, 55, -55)};
    svg_path(out, "solid", head, 3, 1);
    svg_text(out, "small", "middle", MIDDLE_X, MIDDLE_Y - 42, "rotation");
    buffer_text(out, "</g>\n");
}

static void mark(struct buffer *out)
{
    const struct svg_point tip[3] = {{MIDDLE_X, MIDDLE_Y - DISC + 11},
                                     {MIDDLE_X - 7, MIDDLE_Y - DISC + 27},
                                     {MIDDLE_X + 7, MIDDLE_Y - DISC + 27}};
    buffer_text(out, "<g data-what=\"mark\">");
    svg_line(out, "axis", MIDDLE_X, MIDDLE_Y - DISC, MIDDLE_X, MIDDLE_Y - OUTSIDE - 10);
    svg_text(out, "bold", "middle", MIDDLE_X, MIDDLE_Y - OUTSIDE - 15, "mark, 0 deg");
    svg_path(out, "solid", tip, 3, 1);
    buffer_text(out, "</g>\n");
}

static void position(const struct job *job, const struct job_position *p, struct buffer *out)
{
    struct svg_point here = at(job, DISC, p->angle_deg), name = at(job, OUTSIDE, p->angle_deg);
    buffer_format(out, "<g data-what=\"position\" data-position=\"%d\">", p->number);
    svg_circle(out, "free", here.x, here.y, 7);
    if (p->taken) {
        svg_line(out, "axis", here.x - 5, here.y - 5, here.x + 5, here.y + 5);
        svg_line(out, "axis", here.x - 5, here.y + 5, here.x + 5, here.y - 5);
    }
    /* beside the mark's line */
    svg_text(out, "small", "middle", name.x + (p->angle_deg < 1e-6 ? 12 : 0), name.y + 4, "%d",
             p->number);
    buffer_text(out, "</g>\n");
}

/* The angle of a weight that is at no numbered position, beside the mark's line and, at the sides,
 * written away from the disc. */
static void angle_name(const struct job *job, double angle_deg, struct buffer *out)
{
    struct svg_point name = at(job, OUTSIDE, angle_deg);
    char angle[DIGITS_ROOM];
    const double aside = (name.x - MIDDLE_X) / OUTSIDE;
    const bool at_mark = name.y < MIDDLE_Y && fabs(name.x - MIDDLE_X) < 30;
    const char *anchor = aside > 0.4 ? "start" : aside < -0.4 ? "end" : "middle";
    if (at_mark) {
        anchor = aside < 0 ? "end" : "start";
        name.x = MIDDLE_X + (aside < 0 ? -6 : 6);
    }
    svg_text(out, "small", anchor, name.x, name.y + 4, "%s deg",
             digits_angle(angle, job_sheet_angle(job, angle_deg), NAN));
}

static void weight(const struct dossier *d, const struct placement_record *p, struct buffer *out)
{
    const struct job *job = d->job;
    struct svg_point here = at(job, DISC, p->angle_deg), text = at(job, INSIDE, p->angle_deg);
    struct buffer mass = BUFFER_INIT;
    bool cut = p->mass < 0;
    phrase_mass(&mass, job, fabs(p->mass), text_answer_free_half(d, p->plane));
    buffer_text(&mass, cut ? " off" : "");
    buffer_format(out, "<g data-what=\"placement\" data-position=\"%d\">", p->position);
    if (cut)
        svg_square(out, "cut", here.x, here.y, 9);
    else
        svg_circle(out, "fit", here.x, here.y, 11);
    if (mass.failed)
        out->failed = 1;
    else
        svg_text(out, "bold", "middle", text.x, text.y + 4, "%s", mass.bytes);
    if (p->position == 0)
        angle_name(job, p->angle_deg, out);
    buffer_text(out, "</g>\n");
    buffer_release(&mass);
}

/* What stays on the rotor while the placement is added. */
static void stays(const struct dossier *d, size_t plane, struct buffer *out)
{
    int run = d->placements.count ? dossier_base(d->job, d->placements.items[0].relative_to) : -1;
    for (size_t i = 0; run >= 0 && i < d->job->runs[run].weight_count; i++) {
        const struct job_weight *w = &d->job->runs[run].weights[i];
        struct svg_point here = at(d->job, DISC - 16, w->angle_deg);
        if (w->plane == plane)
            svg_diamond(out, "on", here.x, here.y, 7);
    }
}

static void legend(const struct dossier *d, const struct job_plane *plane, struct buffer *out)
{
    const struct job *job = d->job;
    static const char *const turns[] = {"", "clockwise", "counter-clockwise"};
    static const char key[] = "full circle: fit; square: remove; crossed: taken; grey: stays on";
    bool left = (job->angles == SENSE_WITH) == (clockwise(job) > 0);
    double y = MIDDLE_Y + OUTSIDE + 26;
    svg_text(out, "bold", "middle", MIDDLE_X, y, "plane '%s'%s%s", plane->name,
             job->seen_from[0] ? ", seen from " : ", seen from a side the sheet does not name",
             job->seen_from);
    if (job->turning == TURNING_NONE) {
        svg_text(out, "bold", "middle", MIDDLE_X, y + 17,
                 "The sheet does not say which way it turns: this may");
        svg_text(out, "bold", "middle", MIDDLE_X, y + 34,
                 "be the MIRROR IMAGE of the machine. Go by the angles.");
        svg_text(out, "", "middle", MIDDLE_X, y + 51, "angles are counted from the mark, %s",
                 job_sense_text(job));
        y += 17;
    } else {
        svg_text(out, "", "middle", MIDDLE_X, y + 17, "rotation as seen: %s", turns[job->turning]);
        svg_text(out, "", "middle", MIDDLE_X, y + 34, "angles %s: %s in this drawing",
                 job_sense_text(job), left ? "counter-clockwise" : "clockwise");
    }
    svg_text(out, "small", "middle", MIDDLE_X, y + 51, "%s", key);
}

double draw_plane(const struct dossier *d, size_t plane, double y, struct buffer *out)
{
    const struct job_plane *p = &d->job->planes[plane];
    char label[200];
    snprintf(label, sizeof label, "Plane %s with its positions and weights", p->name);
    svg_begin(out, y, WIDE, HIGH, label);
    buffer_text(out, "<g data-what=\"disc\">");
    svg_circle(out, "disc", MIDDLE_X, MIDDLE_Y, DISC);
    buffer_text(out, "</g>\n");
    svg_circle(out, "solid", MIDDLE_X, MIDDLE_Y, 3);
    mark(out);
    arrow(d->job, out);
    for (size_t i = 0; i < p->position_count; i++)
        position(d->job, &p->positions[i], out);
    stays(d, plane, out);
    for (size_t i = 0; i < d->placements.count; i++) {
        if (d->placements.items[i].plane == (int)plane)
            weight(d, &d->placements.items[i], out);
    }
    legend(d, p, out);
    svg_end(out);
    return HIGH;
}
