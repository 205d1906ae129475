#include "report/phrase.h"

#include <math.h>
#include <string.h>

#include "base/angle.h"
#include "report/shown.h"
#include "sheet/units.h"

void phrase_angle(struct buffer *out, const struct job *job, double angle_deg, double half)
{
    char text[DIGITS_ROOM];
    digits_angle(text, job_sheet_angle(job, angle_deg), half);
    buffer_format(out, "%s deg %s", text, job_sense_text(job));
}

void phrase_mass(struct buffer *out, const struct job *job, double kg, double half)
{
    char text[DIGITS_ROOM];
    double shown = shown_mass(job, kg), wide = shown_mass(job, half);
    int place = digits_place(shown, wide), coarsest = digits_place_second(shown);
    if (place > coarsest)
        digits_at(text, shown, coarsest);
    else
        digits_text(text, shown, wide);
    buffer_format(out, "%s %s", text, shown_mass_unit(job));
}

void phrase_signed(struct buffer *out, const struct job *job, double kg, double half)
{
    buffer_text(out, kg < 0 ? "remove " : "");
    phrase_mass(out, job, fabs(kg), half);
}

bool phrase_weight_useless(double kg, double half)
{
    return half > fabs(kg);
}

void phrase_pieces(struct buffer *out, const struct job *job, const double *pieces, size_t count)
{
    if (count <= 1) {
        buffer_text(out, "in one piece");
        return;
    }
    buffer_format(out, "in %zu pieces: ", count);
    for (size_t i = 0; i < count; i++) {
        char text[DIGITS_ROOM];
        digits_text(text, shown_mass(job, pieces[i]), NAN);
        buffer_format(out, "%s%s", i ? " + " : "", text);
    }
    buffer_format(out, " %s", shown_mass_unit(job));
}

void phrase_holes(struct buffer *out, const struct job *job, const struct placement_record *p)
{
    const bool us = job->units == UNITS_US;
    const char *unit = us ? "in" : "mm";
    const double si = units_factor(DIMENSION_LENGTH, unit);
    char text[DIGITS_ROOM];
    if (p->piece_count == 0 || !(p->depths_m[0] > 0) || p->plane < 0 ||
        (size_t)p->plane >= job->plane_count)
        return;
    const double wide = job->planes[p->plane].hole_m;
    if (p->piece_count > 1)
        buffer_format(out, "drill %zu holes", p->piece_count);
    else
        buffer_text(out, "drill one hole");
    if (wide > 0)
        buffer_format(out, " of %s %s", digits_text(text, wide / si, NAN), unit);
    /* A tenth of a millimetre is what a drill's stop can be set to: common practice. */
    for (size_t i = 0; i < p->piece_count; i++)
        buffer_format(out, "%s%s", i ? " + " : ", ",
                      digits_at(text, p->depths_m[i] / si, us ? -3 : -1));
    buffer_format(out, " %s deep", unit);
    double least = p->depths_m[0];
    for (size_t i = 1; i < p->piece_count; i++)
        least = fmin(least, p->depths_m[i]);
    /* Half the diameter over tan 59 deg: a drill's usual point of 118 deg, common practice. */
    const double point = 0.3 * wide;
    if (least < point)
        buffer_format(out,
                      " (that is less than a drill's point is high, about %s %s: go by the mass "
                      "that comes off, or leave it)",
                      digits_at(text, point / si, us ? -2 : 0), unit);
}

void phrase_sits(struct buffer *out, const struct job *job, const struct placement_record *p)
{
    char force[2 * DIGITS_ROOM];
    if (!p->sits || !isfinite(p->total_mass))
        return;
    buffer_text(out, "; then ");
    phrase_mass(out, job, fabs(p->total_mass), NAN);
    buffer_text(out, p->total_mass < 0 ? " are missing there" : " sit there");
    if (isfinite(p->total_force_n))
        buffer_format(out, ", %s", shown_force(job, force, fabs(p->total_force_n)));
}

bool phrase_is_removed(const struct job *job, const struct placement_record *p)
{
    return p->mass < 0 || (p->plane >= 0 && (size_t)p->plane < job->plane_count &&
                           job->planes[p->plane].work == WORK_REMOVE);
}

bool phrase_only_removed(const struct dossier *d)
{
    for (size_t i = 0; i < d->placements.count; i++)
        if (!phrase_is_removed(d->job, &d->placements.items[i]))
            return false;
    return d->placements.count > 0;
}

const char *phrase_fitted(const struct dossier *d)
{
    size_t removed = 0;
    for (size_t i = 0; i < d->placements.count; i++)
        removed += phrase_is_removed(d->job, &d->placements.items[i]);
    if (d->placements.count == 0)
        return "with nothing fitted";
    if (removed == 0)
        return "with the weights above fitted";
    return removed == d->placements.count ? "with the material above removed"
                                          : "with the weights above fitted and removed";
}

void phrase_weight(struct buffer *out, const struct job *job, const struct job_weight *w)
{
    if (w->mounted_mass < 0) {
        phrase_mass(out, job, -w->mounted_mass, NAN);
        buffer_text(out, " removed");
    } else {
        phrase_mass(out, job, w->mounted_mass, NAN);
    }
    buffer_text(out, " at ");
    phrase_angle(out, job, w->angle_deg, NAN);
    if (w->plane >= job->plane_count)
        return;
    const struct job_plane *plane = &job->planes[w->plane];
    buffer_format(out, " on plane '%s'", plane->name);
    if (w->position > 0)
        buffer_format(out, ", position %d", w->position);
    if (isfinite(w->radius_m) && fabs(w->radius_m - plane->radius_m) > 1e-6 * plane->radius_m) {
        const char *unit = job->units == UNITS_US ? "in" : "mm";
        char text[DIGITS_ROOM];
        digits_text(text, w->radius_m / units_factor(DIMENSION_LENGTH, unit), NAN);
        buffer_format(out, ", at radius %s %s", text, unit);
    }
}

void phrase_weights(struct buffer *out, const struct job *job, size_t run)
{
    const struct job_run *r = &job->runs[run];
    if (r->weight_count == 0)
        buffer_text(out, "no weights");
    for (size_t i = 0; i < r->weight_count; i++) {
        if (i > 0)
            buffer_text(out, "; ");
        phrase_weight(out, job, &r->weights[i]);
    }
}

void phrase_weight_half(double mass, double angle_deg, const double cov[3], double half[2])
{
    /* The weight is a vector like a reading's: along it the mass, across it the angle. The "show"
     * is plain SI. */
    static const struct show plain = {"m", QUANTITY_DISPLACEMENT, 1, DETECTION_PEAK};
    double turned = angle_deg * PI / 180;
    double complex w = mass * cexp(I * turned);
    struct shown s = shown_vector(w, cov, QUANTITY_DISPLACEMENT, NAN, &plain, NAN);
    half[0] = s.half;
    half[1] = s.lag_half;
}

static bool is_first_of_check(const struct dossier *d, size_t finding)
{
    const struct finding_record *f = &d->findings.items[finding];
    for (size_t i = 0; i < finding; i++)
        if (d->findings.items[i].verdict == f->verdict &&
            strcmp(d->findings.items[i].check, f->check) == 0)
            return false;
    return true;
}

void phrase_checks(struct buffer *out, const struct dossier *d, enum verdict verdict)
{
    size_t named = 0;
    for (size_t i = 0; i < d->findings.count; i++) {
        const struct finding_record *f = &d->findings.items[i];
        if (f->verdict != verdict || !is_first_of_check(d, i))
            continue;
        if (named < 4)
            buffer_format(out, "%s%s", named ? ", " : " (", f->check);
        else if (named == 4)
            buffer_text(out, ", ...");
        named++;
    }
    buffer_text(out, named ? ")" : "");
}

void phrase_sentence(struct buffer *out, const char *text)
{
    size_t length = strlen(text);
    if (length == 0)
        return;
    char first = *text >= 'a' && *text <= 'z' ? (char)(*text - 'a' + 'A') : *text;
    buffer_add(out, &first, 1);
    buffer_text(out, text + 1);
    if (!strchr(".!?", text[length - 1]))
        buffer_text(out, ".");
}
