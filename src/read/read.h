/* read.h - the stage `read`. */
#ifndef LOPSIDE_READ_READ_H
#define LOPSIDE_READ_READ_H

/* Runs the stage with its own arguments (argv[0] is its name); returns the exit code. */
int stage_read(int argc, char **argv);

/* How far the stage is, for a process that shares the memory with it. Bytes of the recordings; each
 * is written by the stage and read by the other. */
struct read_progress {
    _Atomic long long done, total;
};

/* From now on the stage notes there how far it is. Borrowed; NULL: nowhere. */
void stage_read_watch(struct read_progress *progress);

#endif
