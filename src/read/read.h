/* read.h - the stage `read`. */
#ifndef LOPSIDE_READ_READ_H
#define LOPSIDE_READ_READ_H

/* Runs the stage with its own arguments (argv[0] is its name); returns the exit code. */
int stage_read(int argc, char **argv);

#endif
