#include "report/heed.h"

#include <math.h>
#include <string.h>

#include "report/mounting.h"
#include "report/shown.h"
#include "report/text_readings.h"

const char *heed_within(const struct residual_record *r)
{
    /* An upper end of twice what is allowed says as little as no estimate would: our choice. */
    const double blind = 2;
    if (isnan(r->after) || isnan(r->permissible))
        return "not known";
    if (r->after > r->permissible)
        return "NOT MET";
    if (r->after_95 <= r->permissible)
        return "met";
    return r->after_95 <= blind * r->permissible ? "not proven" : "not known";
}

/* Hand readings have a sense of their own, which no recording checks. */
static void counting(struct buffer *out, const struct dossier *d)
{
    bool hand = false, blind = false;
    for (size_t i = 0; i < d->readings.count; i++)
        hand = hand || (d->readings.items[i].reading.blocks == 0 &&
                        d->readings.items[i].reading.has_phase && d->readings.items[i].use);
    for (size_t i = 0; i < d->findings.count; i++) {
        const struct finding_record *f = &d->findings.items[i];
        blind = blind || (strcmp(f->check, "tape-moved") == 0 && text_readings_uncheckable(f));
    }
    if (d->placements.count > 0 && hand && blind)
        buffer_format(
            out,
            "To be read first: these runs cannot show a wrong counting sense. Were "
            "`phase` (%s) or `angles` (%s) the other way round at the instrument or on "
            "the rotor, the weight would be at a wrong angle and nothing here would tell. "
            "Make sure of both, or run a second trial at another angle.",
            d->job->phase == PHASE_LEAD ? "lead" : "lag", job_sense_text(d->job));
}

static void tolerance(struct buffer *out, const struct dossier *d)
{
    for (size_t i = 0; i < d->residuals.count; i++) {
        const struct residual_record *r = &d->residuals.items[i];
        char after[DIGITS_ROOM], most[DIGITS_ROOM];
        if (strcmp(heed_within(r), "NOT MET") != 0)
            continue;
        if (out->length == 0)
            buffer_text(out, "Tolerance NOT MET on ");
        else
            buffer_text(out, "; on ");
        buffer_format(out, "plane '%s': %s %s estimated, %s permissible",
                      dossier_plane(d, r->plane),
                      digits_against(after, shown_unbalance(d->job, r->after),
                                     shown_unbalance(d->job, r->after_95 - r->after),
                                     shown_unbalance(d->job, r->permissible)),
                      shown_unbalance_unit(d->job),
                      digits_text(most, shown_unbalance(d->job, r->permissible), NAN));
    }
    if (out->length > 0) {
        const char *basis = d->residuals.items[0].basis;
        buffer_format(out, " (%.*s)%s", (int)strcspn(basis, ",;"), basis,
                      d->placements.count > 0 ? "." : ", whatever the vibration is.");
    }
}

void heed_line(struct buffer *out, const struct dossier *dossier, size_t which)
{
    if (which == 0)
        mounting_carried(out, dossier);
    else if (which == 1)
        counting(out, dossier);
    else
        tolerance(out, dossier);
}
