/* track.h - the stage `track`. */
#ifndef LOPSIDE_TRACK_TRACK_H
#define LOPSIDE_TRACK_TRACK_H

/* Runs the stage with its own arguments (argv[0] is its name); returns the exit code. */
int stage_track(int argc, char **argv);

#endif
