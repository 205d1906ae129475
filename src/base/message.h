/* message.h - the one way to say something on standard error.
 *
 * Every message is one line, "lopside STAGE: what is wrong: 'name' (place)", lower case, cause
 * first. Control characters in it (they can come from file names and sheets) are shown as \xNN and
 * never reach the terminal; UTF-8 passes. The line is written with one write(2).
 */
#ifndef LOPSIDE_BASE_MESSAGE_H
#define LOPSIDE_BASE_MESSAGE_H

/* Sets the name before every message: "track" gives "lopside track: ". NULL gives "lopside: ".
 * The string is borrowed for the life of the process. */
void message_stage(const char *name);

/* Prints one line; a newline is added. Longer than 4 KiB is cut. */
void message(const char *format, ...) __attribute__((format(printf, 1, 2)));

/* The line for a failed allocation, in one wording everywhere. Returns STATUS_SYSTEM. */
int message_no_memory(void);

#endif
