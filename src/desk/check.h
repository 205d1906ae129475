/* check.h - a job sheet and its recordings looked at before the long work. */
#ifndef LOPSIDE_DESK_CHECK_H
#define LOPSIDE_DESK_CHECK_H

/* `lopside check SHEET [RECORDING...]`; returns the exit code. */
int desk_check(int argc, char **argv);

#endif
