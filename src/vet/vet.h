/* vet.h - the stage `vet`. */
#ifndef LOPSIDE_VET_VET_H
#define LOPSIDE_VET_VET_H

/* Runs the stage with its own arguments (argv[0] is its name); returns the exit code. */
int stage_vet(int argc, char **argv);

#endif
