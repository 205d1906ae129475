#include "track/track.h"

int stage_track(int argc, char **argv)
{
    (void)argc;
    (void)argv;
    return 1;
}
