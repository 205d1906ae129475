/* average.h - the stage `average`. */
#ifndef LOPSIDE_AVERAGE_AVERAGE_H
#define LOPSIDE_AVERAGE_AVERAGE_H

/* Runs the stage with its own arguments (argv[0] is its name); returns the exit code. */
int stage_average(int argc, char **argv);

#endif
