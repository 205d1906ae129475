/* report.h - the stage `report`. */
#ifndef LOPSIDE_REPORT_REPORT_H
#define LOPSIDE_REPORT_REPORT_H

/* Runs the stage with its own arguments (argv[0] is its name); returns the exit code. */
int stage_report(int argc, char **argv);

#endif
