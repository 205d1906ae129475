/* main.c - names the stages in the order of the chain, and what stands around it. */
#include <fcntl.h>
#include <signal.h>
#include <stdbool.h>
#include <stdio.h>
#include <string.h>
#include <unistd.h>

#include "average/average.h"
#include "base/message.h"
#include "base/nearest.h"
#include "base/status.h"
#include "desk/balance.h"
#include "desk/check.h"
#include "desk/new.h"
#include "read/read.h"
#include "report/report.h"
#include "solve/solve.h"
#include "track/track.h"
#include "vet/vet.h"

struct command {
    const char *name;
    int (*run)(int argc, char **argv);
    const char *job;
};

static const struct command commands[] = {
    {"read", stage_read, "job sheet and recordings become one calibrated sample stream"},
    {"track", stage_track, "samples become one vector per sensor per block of turns"},
    {"average", stage_average, "blocks become one reading per sensor per run, with covariance"},
    {"vet", stage_vet, "may these readings carry a correction?"},
    {"solve", stage_solve, "responses, correction, placement, forecast, the next step"},
    {"report", stage_report, "what people read: text, html, csv, json, svg"},
    {"balance", desk_balance, "the six stages joined by pipes, from a sheet to a report"},
    {"new", desk_new, "a first job sheet out of recordings and a few answers"},
    {"check", desk_check, "is the sheet right, and what is on the channels?"},
    {NULL, NULL, NULL},
};

static const struct command *find(const char *name)
{
    for (const struct command *c = commands; c->name; c++)
        if (!strcmp(c->name, name))
            return c;
    return NULL;
}

static int no_such_stage(const char *name)
{
    const char *names[sizeof commands / sizeof *commands + 1] = {"help"};
    char hint[NEAREST_ROOM];
    size_t count = 1;
    for (const struct command *c = commands; c->name; c++)
        names[count++] = c->name;
    message("no such stage: '%s'%s (see 'lopside help')", name,
            nearest_hint(name, names, count, hint));
    return STATUS_USAGE;
}

static void print_help(void)
{
    puts("lopside - from vibration recordings to a balance weight\n\n"
         "Usage: lopside STAGE [OPTION...] [ARGUMENT...]\n\n"
         "  lopside balance SHEET\n"
         "  lopside read SHEET | lopside track | lopside average | lopside vet |\n"
         "      lopside solve | lopside report\n");
    for (const struct command *c = commands; c->name; c++)
        printf("  %-8s  %s\n", c->name, c->job);
    puts("\n'lopside help STAGE' says more. Exit codes: 0 done, 1 the system failed, 2 usage or\n"
         "job sheet, 3 a recording, 4 readings refused, 5 no correction exists.");
}

static int finish_output(void)
{
    if (fflush(stdout) == 0 && !ferror(stdout))
        return STATUS_DONE;
    message("cannot write to standard output");
    return STATUS_SYSTEM;
}

static int run_command(const struct command *command, int argc, char **argv)
{
    message_stage(command->name);
    int status = command->run(argc, argv);
    return status == STATUS_DONE ? finish_output() : status; /* a failure has said its line */
}

static bool is_help(const char *name)
{
    return !strcmp(name, "help") || !strcmp(name, "--help") || !strcmp(name, "-h");
}

static int print_version(void)
{
    printf("lopside %s\n", LOPSIDE_VERSION);
    return finish_output();
}

static int help(int argc, char **argv)
{
    if (argc < 3 || is_help(argv[2])) {
        print_help();
        return finish_output();
    }
    if (!strcmp(argv[2], "--version"))
        return print_version();
    const struct command *command = find(argv[2]);
    if (!command)
        return no_such_stage(argv[2]);
    char *arguments[] = {argv[2], (char *)"--help", NULL};
    return run_command(command, 2, arguments);
}

int main(int argc, char **argv)
{
    /* A closed pipe ends a stage as the shell expects, whatever the parent had set. */
    signal(SIGPIPE, SIG_DFL);
    /* No file that is opened later may become standard input, output or error. */
    int fd;
    do {
        fd = open("/dev/null", O_RDONLY); /* for reading, so that writing to a closed one still fails */
    } while (fd >= 0 && fd <= STDERR_FILENO);
    if (fd > STDERR_FILENO)
        close(fd);
    if (argc < 2) {
        message("missing stage (see 'lopside help')");
        return STATUS_USAGE;
    }
    if (is_help(argv[1]))
        return help(argc, argv);
    if (!strcmp(argv[1], "--version"))
        return print_version();
    const struct command *command = find(argv[1]);
    if (!command)
        return no_such_stage(argv[1]);
    return run_command(command, argc - 1, argv + 1);
}
