/* sheet_parse.h - what the parts of the sheet's reader share. */
#ifndef LOPSIDE_SHEET_SHEET_PARSE_H
#define LOPSIDE_SHEET_SHEET_PARSE_H

#include "sheet/sheet.h"
#include "sheet/sheet_errors.h"
#include "sheet/sheet_lines.h"

struct sheet_parse {
    struct sheet *sheet;
    bool audit;
    struct sheet_lines lines;
    struct sheet_errors errors;
    size_t *sensor_sections; /* owned: section of each sensor, plane and run of the job */
    size_t *plane_sections;
    size_t *run_sections;
};

/* The parts, in the order in which they must be called. Each reads its sections into the sheet and
 * notes what is wrong in `errors`; a value that is wrong is left absent. */
void sheet_machine_read(struct sheet_parse *p);  /* [job], [rotor], [recording], [tacho] */
void sheet_sensors_read(struct sheet_parse *p);  /* [sensor NAME] */
void sheet_planes_read(struct sheet_parse *p);   /* [plane NAME] */
void sheet_runs_read(struct sheet_parse *p);     /* [run NAME] */
void sheet_aim_read(struct sheet_parse *p);      /* [aim], [limits] */
void sheet_responses_read(struct sheet_parse *p); /* the file of stored responses, [aim] read */
void sheet_checks_cross(struct sheet_parse *p);  /* what concerns several sections */

/* The layout's keys of one section over what `layout` holds already. */
void sheet_machine_layout(struct sheet_parse *p, size_t section, struct sheet_layout *layout);

/* "100 mV/g" over *scale, for a sensor of that quantity. */
void sheet_sensors_scale(struct sheet_parse *p, const struct sheet_entry *entry,
                         enum quantity quantity, struct sheet_scale *scale);

/* A channel's number or column name into room of NAME_ROOM bytes. */
void sheet_sensors_channel(struct sheet_parse *p, const struct sheet_entry *entry, char *channel);

#endif
