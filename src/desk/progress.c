#define _DEFAULT_SOURCE /* MAP_ANONYMOUS */
#include "desk/progress.h"

#include <math.h>
#include <stdio.h>
#include <string.h>
#include <sys/mman.h>
#include <time.h>
#include <unistd.h>

static double now(void)
{
    struct timespec t;
    clock_gettime(CLOCK_MONOTONIC, &t);
    return (double)t.tv_sec + 1e-9 * (double)t.tv_nsec;
}

void progress_begin(struct progress *progress)
{
    *progress = (struct progress){.began = now()};
    if (!isatty(STDERR_FILENO) || tcgetpgrp(STDERR_FILENO) != getpgrp())
        return;
    void *shared = mmap(NULL, sizeof *progress->shared, PROT_READ | PROT_WRITE,
                        MAP_SHARED | MAP_ANONYMOUS, -1, 0);
    if (shared == MAP_FAILED)
        return; /* the work goes on without */
    progress->shared = shared;
    stage_read_watch(progress->shared);
}

static void size_text(char *text, size_t room, double bytes)
{
    if (bytes >= 999.5e6)
        snprintf(text, room, "%.1f GB", bytes / 1e9);
    else
        snprintf(text, room, "%.0f MB", bytes / 1e6);
}

static void time_text(char *text, size_t room, double seconds)
{
    if (seconds >= 3600)
        snprintf(text, room, "%.1f h", seconds / 3600);
    else if (seconds >= 90)
        snprintf(text, room, "%.0f min", ceil(seconds / 60));
    else
        snprintf(text, room, "%.0f s", ceil(seconds));
}

void progress_text(char *text, size_t room, double done, double total, double seconds)
{
    char of[24], rate[24], left[24];
    *text = '\0';
    if (!(total > 0) || !(seconds > 0))
        return;
    size_text(of, sizeof of, total);
    size_text(rate, sizeof rate, done / seconds);
    time_text(left, sizeof left, done > 0 ? (total - done) / done * seconds : 0);
    if (done > 0)
        snprintf(text, room, "%.0f %% of %s, %s/s, %s left", floor(100 * done / total), of, rate,
                 left);
    else
        snprintf(text, room, "0 %% of %s", of);
}

static void put(const char *text)
{
    if (write(STDERR_FILENO, text, strlen(text)) < 0)
        return; /* nobody looks */
}

void progress_show(struct progress *progress)
{
    char text[64], line[128];
    if (!progress->shared || now() - progress->began < PROGRESS_AFTER)
        return;
    progress_text(text, sizeof text, (double)progress->shared->done,
                  (double)progress->shared->total, now() - progress->began);
    if (!*text)
        return;
    snprintf(line, sizeof line, "\r%-72s", text);
    put(line);
    progress->shown = true;
}

void progress_end(struct progress *progress)
{
    char line[128];
    if (progress->shown) {
        snprintf(line, sizeof line, "\r%-72s\r", "");
        put(line);
    }
    if (progress->shared) {
        stage_read_watch(NULL);
        munmap(progress->shared, sizeof *progress->shared);
    }
    *progress = (struct progress){0};
}
