/* new.h - a first job sheet out of recordings and a few answers. */
#ifndef LOPSIDE_DESK_NEW_H
#define LOPSIDE_DESK_NEW_H

/* `lopside new [OPTION...] RECORDING...`; returns the exit code. */
int desk_new(int argc, char **argv);

#endif
