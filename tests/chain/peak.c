/* peak.c - runs a command and appends its peak resident memory in KiB to a file.
 *
 *     peak FILE COMMAND [ARGUMENT...]
 *
 * Linux counts what a parent held when it started a child as the child's peak; this parent is small.
 * Its exit code is the command's.
 */
#include <stdio.h>
#include <sys/resource.h>
#include <sys/wait.h>
#include <unistd.h>

int main(int argc, char **argv)
{
    if (argc < 3)
        return 2;
    pid_t child = fork();
    if (child < 0)
        return 1;
    if (child == 0) {
        execv(argv[2], argv + 2);
        _exit(127);
    }
    int status;
    struct rusage usage;
    if (waitpid(child, &status, 0) < 0 || getrusage(RUSAGE_CHILDREN, &usage) < 0)
        return 1;
    FILE *file = fopen(argv[1], "a");
    if (!file || fprintf(file, "%ld\n", usage.ru_maxrss) < 0 || fclose(file))
        return 1;
    return WIFEXITED(status) ? WEXITSTATUS(status) : 1;
}
