#include "read/adopt.h"

#include <math.h>
#include <stdbool.h>
#include <stdlib.h>
#include <string.h>

#include "read/names.h"

static void release_runs(struct job_run *runs, struct sheet_run *layouts, size_t count)
{
    for (size_t i = 0; i < count; i++) {
        for (size_t f = 0; layouts && f < layouts[i].file_count; f++)
            free(layouts[i].files[f]);
        if (layouts) {
            free(layouts[i].files);
            free(layouts[i].file_lines);
            free(layouts[i].channels);
            free(layouts[i].scales);
        }
        free(runs[i].weights);
        free(runs[i].hand);
        free(runs[i].without);
    }
    free(layouts);
    free(runs);
}

/* A recording as a run of its own, laid out as [recording] says. 0 or -1. */
static int adopt(const struct sheet *sheet, const char *path, const char *name, struct job_run *run,
                 struct sheet_run *layout)
{
    const size_t sensors = sheet->job.sensor_count;
    *run = (struct job_run){.condition = "service", .speed_rpm = NAN};
    memcpy(run->name, name, NAME_ROOM);
    *layout = (struct sheet_run){.layout = sheet->layout};
    run->without = calloc(sensors ? sensors : 1, sizeof *run->without);
    layout->files = calloc(1, sizeof *layout->files);
    layout->file_lines = calloc(1, sizeof *layout->file_lines);
    layout->channels = calloc(sensors ? sensors : 1, sizeof *layout->channels);
    layout->scales = calloc(sensors ? sensors : 1, sizeof *layout->scales);
    if (!run->without || !layout->files || !layout->file_lines || !layout->channels ||
        !layout->scales)
        return -1;
    layout->files[0] = strdup(path);
    if (!layout->files[0])
        return -1;
    layout->file_count = 1;
    for (size_t s = 0; s < sensors; s++) {
        memcpy(layout->channels[s], sheet->job.sensors[s].channel, NAME_ROOM);
        layout->scales[s] = sheet->scales[s];
    }
    return 0;
}

int adopt_recordings(struct sheet *sheet, char *const *paths, size_t count)
{
    char(*names)[NAME_ROOM] = calloc(count, sizeof *names);
    struct job_run *runs = calloc(count, sizeof *runs);
    struct sheet_run *layouts = calloc(count, sizeof *layouts);
    bool fine = names && runs && layouts && names_from_paths(paths, count, names) == 0;
    for (size_t i = 0; fine && i < count; i++)
        fine = adopt(sheet, paths[i], names[i], &runs[i], &layouts[i]) == 0;
    free(names);
    if (!fine) {
        release_runs(runs, layouts, runs && layouts ? count : 0);
        return -1;
    }
    release_runs(sheet->job.runs, sheet->runs, sheet->job.run_count);
    sheet->job.runs = runs;
    sheet->job.run_count = count;
    sheet->job.aim.mounted = -1;
    sheet->runs = layouts;
    return 0;
}
