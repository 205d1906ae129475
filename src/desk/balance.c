#define _XOPEN_SOURCE 700 /* realpath */
#include "desk/balance.h"

#include <errno.h>
#include <fcntl.h>
#include <poll.h>
#include <signal.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>
#include <sys/stat.h>
#include <sys/wait.h>
#include <unistd.h>

#include "average/average.h"
#include "base/buffer.h"
#include "base/message.h"
#include "base/options.h"
#include "base/status.h"
#include "desk/progress.h"
#include "read/read.h"
#include "report/report.h"
#include "solve/solve.h"
#include "track/track.h"
#include "vet/vet.h"

#define STAGES 6
#define SAID_MOST (64 * 1024) /* of one stage's standard error; the rest is dropped */

struct link {
    const char *name;
    int (*run)(int argc, char **argv);
    int argc;
    char *argv[8];
    pid_t pid;
    int status;         /* of waitpid */
    int said_fd;        /* its standard error */
    struct buffer said;
};

struct chain {
    struct link links[STAGES];
    const char *output;  /* -o; NULL: standard output */
    char *target;        /* owned: where it leads, through links; NULL: a new file */
    char *temporary;     /* owned name beside it; NULL: written to as it stands */
    int output_fd;
};

/* ---- the output file: whole or not at all ---- */

/* What a signal that ends the program has to take away: the temporary file's name. */
static char *volatile unfinished;

static void take_away(int signal_number)
{
    if (unfinished)
        unlink(unfinished);
    signal(signal_number, SIG_DFL);
    raise(signal_number);
}

static void watch_signals(bool on)
{
    static const int signals[] = {SIGINT, SIGTERM, SIGHUP};
    for (size_t i = 0; i < sizeof signals / sizeof *signals; i++) {
        struct sigaction action = {.sa_handler = on ? take_away : SIG_DFL};
        struct sigaction before;
        sigemptyset(&action.sa_mask);
        if (sigaction(signals[i], NULL, &before) == 0 && before.sa_handler != SIG_IGN)
            sigaction(signals[i], &action, NULL);
    }
}

static int output_failure(const struct chain *chain)
{
    message("cannot write: '%s' (%s)", chain->output, strerror(errno));
    return STATUS_SYSTEM;
}

/* A device or a pipe is written to as it stands; a file, or what a link names, is replaced whole. */
static int open_output(struct chain *chain)
{
    struct stat what;
    chain->output_fd = STDOUT_FILENO;
    if (!chain->output)
        return STATUS_DONE;
    const bool exists = stat(chain->output, &what) == 0;
    if (exists && !S_ISREG(what.st_mode)) {
        chain->output_fd = open(chain->output, O_WRONLY | O_CLOEXEC);
        return chain->output_fd < 0 ? output_failure(chain) : STATUS_DONE;
    }
    chain->target = realpath(chain->output, NULL); /* NULL: a new file */
    const char *target = chain->target ? chain->target : chain->output;
    size_t room = strlen(target) + 16;
    chain->temporary = malloc(room);
    if (!chain->temporary)
        return message_no_memory();
    snprintf(chain->temporary, room, "%s.XXXXXX", target);
    chain->output_fd = mkstemp(chain->temporary);
    if (chain->output_fd < 0) {
        free(chain->temporary);
        chain->temporary = NULL;
        return output_failure(chain);
    }
    unfinished = chain->temporary;
    watch_signals(true);
    mode_t mask = umask(0); /* as any new file, not mkstemp's 0600; who was kept out stays out */
    umask(mask);
    (void)fchmod(chain->output_fd, exists ? what.st_mode & 0777 : 0666 & ~mask);
    return STATUS_DONE;
}

/* 0 once all of it is on disk and in its place; -1 with errno of the first failure. */
static int put_in_place(struct chain *chain)
{
    int failed = fsync(chain->output_fd) < 0 ? errno : 0;
    if (close(chain->output_fd) < 0 && !failed)
        failed = errno;
    if (!failed &&
        rename(chain->temporary, chain->target ? chain->target : chain->output) < 0)
        failed = errno;
    errno = failed;
    return failed ? -1 : 0;
}

/* Puts the file in its place where the report is whole, and takes it away otherwise. */
static int close_output(struct chain *chain, int status)
{
    bool whole = status == STATUS_DONE || status == STATUS_REFUSED || status == STATUS_UNSOLVED;
    if (chain->temporary && whole && put_in_place(chain) < 0) {
        status = output_failure(chain);
        whole = false;
    }
    if (chain->temporary && !whole)
        unlink(chain->temporary);
    watch_signals(false);
    unfinished = NULL;
    free(chain->temporary);
    free(chain->target);
    chain->temporary = chain->target = NULL;
    return status;
}

/* ---- the processes ---- */

static void run_child(struct link *link, int in, int out, int said)
{
    watch_signals(false);
    dup2(in, STDIN_FILENO);
    dup2(out, STDOUT_FILENO);
    dup2(said, STDERR_FILENO);
    for (int fd = 3; fd < 64; fd++) /* no stage holds another's pipe open */
        close(fd);
    message_stage(link->name);
    int status = link->run(link->argc, link->argv);
    if (fflush(stdout) != 0 && status == STATUS_DONE)
        status = STATUS_SYSTEM;
    _exit(status);
}

static int system_failure(const char *what)
{
    message("cannot %s: %s", what, strerror(errno));
    return STATUS_SYSTEM;
}

static void close_unless(int fd, int keep)
{
    if (fd >= 0 && fd != keep)
        close(fd);
}

/* Starts the stages; on failure those already started are ended by their closing pipes. */
static int start(struct chain *chain)
{
    int in = open("/dev/null", O_RDONLY);
    int status = in < 0 ? system_failure("open /dev/null") : STATUS_DONE;
    for (int i = 0; i < STAGES && status == STATUS_DONE; i++) {
        struct link *link = &chain->links[i];
        int next[2] = {-1, chain->output_fd}, said[2] = {-1, -1};
        bool last = i == STAGES - 1;
        if ((!last && pipe(next) < 0) || pipe(said) < 0) {
            status = system_failure("make a pipe");
        } else {
            link->pid = fork();
            if (link->pid == 0)
                run_child(link, in, next[1], said[1]);
            if (link->pid < 0)
                status = system_failure("start a stage");
        }
        close_unless(in, -1);
        close_unless(said[1], -1);
        close_unless(next[1], chain->output_fd);
        in = next[0];
        link->said_fd = said[0];
    }
    close_unless(in, -1);
    return status;
}

/* Reads what all stages say until they have closed. How far it is stands on a terminal until
 * `read` has ended: before the report begins. */
static void listen_to(struct chain *chain, struct progress *progress)
{
    for (;;) {
        if (chain->links[0].said_fd < 0)
            progress_end(progress);
        struct pollfd fds[STAGES];
        int open_count = 0;
        for (int i = 0; i < STAGES; i++) {
            fds[i] = (struct pollfd){chain->links[i].said_fd, POLLIN, 0};
            open_count += chain->links[i].said_fd >= 0;
        }
        if (!open_count)
            return;
        const int ready = poll(fds, STAGES, progress->shared ? PROGRESS_EVERY : -1);
        if (ready < 0 && errno != EINTR)
            return;
        progress_show(progress);
        if (ready <= 0)
            continue;
        for (int i = 0; i < STAGES; i++) {
            struct link *link = &chain->links[i];
            char bytes[4096];
            if (!(fds[i].revents & (POLLIN | POLLHUP | POLLERR)))
                continue;
            ssize_t got = read(link->said_fd, bytes, sizeof bytes);
            if (got > 0 && link->said.length < SAID_MOST)
                buffer_add(&link->said, bytes, (size_t)got);
            if (got == 0 || (got < 0 && errno != EINTR)) {
                close(link->said_fd);
                link->said_fd = -1;
            }
        }
    }
}

static void wait_for(struct chain *chain)
{
    for (int i = 0; i < STAGES; i++) {
        struct link *link = &chain->links[i];
        while (link->pid > 0 && waitpid(link->pid, &link->status, 0) < 0 && errno == EINTR)
            ;
    }
}

/* ---- what came of it ---- */

static bool died_of_pipe(const struct link *link)
{
    return WIFSIGNALED(link->status) && WTERMSIG(link->status) == SIGPIPE;
}

static void repeat(const struct link *link)
{
    size_t done = 0;
    while (done < link->said.length) {
        ssize_t wrote =
            write(STDERR_FILENO, link->said.bytes + done, link->said.length - done);
        if (wrote <= 0)
            return;
        done += (size_t)wrote;
    }
}

/* The first failure in the chain that is not a closed pipe caused the others: what the stages
 * behind it say (an early end, the same refusal again) is not printed. */
static int judge(struct chain *chain)
{
    for (int i = 0; i < STAGES; i++) {
        const struct link *link = &chain->links[i];
        if (died_of_pipe(link))
            continue;
        repeat(link);
        if (WIFSIGNALED(link->status)) {
            message("stage died: '%s' (signal %d)", link->name, WTERMSIG(link->status));
            return STATUS_SYSTEM;
        }
        if (WEXITSTATUS(link->status) != STATUS_DONE)
            return WEXITSTATUS(link->status);
    }
    return STATUS_DONE;
}

static void prepare(struct chain *chain, char *sheet, char *form, char *what)
{
    static const struct {
        const char *name;
        int (*run)(int argc, char **argv);
    } stages[STAGES] = {{"read", stage_read},       {"track", stage_track},
                        {"average", stage_average}, {"vet", stage_vet},
                        {"solve", stage_solve},     {"report", stage_report}};
    for (int i = 0; i < STAGES; i++) {
        struct link *link = &chain->links[i];
        *link = (struct link){.name = stages[i].name, .run = stages[i].run, .said_fd = -1};
        link->argv[link->argc++] = (char *)stages[i].name;
    }
    struct link *read = &chain->links[0], *report = &chain->links[STAGES - 1];
    read->argv[read->argc++] = (char *)"--";
    read->argv[read->argc++] = sheet;
    if (form) {
        report->argv[report->argc++] = (char *)"--as";
        report->argv[report->argc++] = form;
    }
    if (what) {
        report->argv[report->argc++] = (char *)"--what";
        report->argv[report->argc++] = what;
    }
}

int desk_balance(int argc, char **argv)
{
    const char *form = NULL, *what = NULL;
    struct chain chain = {.output = NULL};
    struct progress progress;
    const struct option options[] = {
        {"as", 0, OPTION_TEXT, "FORM", "text", 0, 0, NULL, "what the report is written as", &form},
        {"what", 0, OPTION_TEXT, "PART", NULL, 0, 0, NULL, "the part of it, for --as csv or svg", &what},
        {"output", 'o', OPTION_TEXT, "FILE", NULL, 0, 0, NULL,
         "write the report there, whole or not at all", &chain.output},
        {NULL, 0, OPTION_FLAG, NULL, NULL, 0, 0, NULL, NULL, NULL}};
    const struct usage usage = {"balance", "SHEET",
                                "the six stages joined by pipes, from a sheet to a report", options, 1,
                                1, NULL};
    struct option_list operands;
    int parsed = options_parse(&usage, argc, argv, &operands);
    int status = parsed == OPTIONS_MISUSE ? STATUS_USAGE : STATUS_DONE;

    if (parsed == OPTIONS_GO)
        status = open_output(&chain);
    if (parsed == OPTIONS_GO && status == STATUS_DONE) {
        prepare(&chain, (char *)operands.items[0], (char *)form, (char *)what);
        progress_begin(&progress);
        status = start(&chain);
        listen_to(&chain, &progress);
        progress_end(&progress);
        wait_for(&chain);
        bool reader_left = died_of_pipe(&chain.links[STAGES - 1]);
        if (status == STATUS_DONE)
            status = judge(&chain);
        status = close_output(&chain, status);
        if (reader_left && status == STATUS_DONE)
            raise(SIGPIPE); /* as any program whose reader went away */
    }
    for (int i = 0; i < STAGES; i++)
        buffer_release(&chain.links[i].said);
    option_list_release(&operands);
    return status;
}
