/* solve.h - the stage `solve`. */
#ifndef LOPSIDE_SOLVE_SOLVE_H
#define LOPSIDE_SOLVE_SOLVE_H

/* Runs the stage with its own arguments (argv[0] is its name); returns the exit code. */
int stage_solve(int argc, char **argv);

#endif
