/* SHA-256 against published vectors; the queue, the line count and the faults of files. */
#include <setjmp.h>
#include <stdarg.h>
#include <stddef.h>
#include <stdint.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>
#include <unistd.h>

#include <cmocka.h>

#include "read/digest.h"
#include "read/lines.h"

static void write_file(char *path, const char *bytes, size_t length)
{
    strcpy(path, "read_digest_XXXXXX");
    const int fd = mkstemp(path);
    assert_true(fd >= 0);
    assert_int_equal(write(fd, bytes, length), (ssize_t)length);
    close(fd);
}

/* FIPS 180-4, examples by NIST, through files: "abc", the 448-bit message, and a million "a", with
 * files that cannot be hashed among them. */
static void test_queue(void **unused)
{
    (void)unused;
    char first[32], second[32], million[32];
    const char *message = "abcdbcdecdefdefgefghfghighijhijkijkljklmklmnlmnomnopnopq";
    char *text = malloc(1000000);
    assert_non_null(text);
    memset(text, 'a', 1000000);
    write_file(first, "abc", 3);
    write_file(second, message, strlen(message));
    write_file(million, text, 1000000);
    free(text);
    char *const paths[] = {first, (char *)"no-such-file", million, (char *)".", second};
    struct digest_queue *queue = digest_queue_new(paths, 5);
    assert_non_null(queue);
    const struct digest *d = digest_queue_wait(queue, 2);
    assert_int_equal(d->fault.status, STATUS_DONE);
    assert_string_equal(d->sha256,
                        "cdc76e5c9914fb9281a1c7e284d73e67f1809a48a497200e046d39ccc7112cd0");
    assert_true(d->mark.size == 1000000);
    assert_string_equal(digest_queue_wait(queue, 0)->sha256,
                        "ba7816bf8f01cfea414140de5dae2223b00361a396177a9cb410ff61f20015ad");
    assert_string_equal(digest_queue_wait(queue, 4)->sha256,
                        "248d6a61d20638b8e5c026930c3e6039a33ce45964ff2167f6ecedd419db06c1");
    assert_int_equal(digest_queue_wait(queue, 1)->fault.status, STATUS_RECORDING);
    assert_int_equal(digest_queue_wait(queue, 3)->fault.status, STATUS_RECORDING);
    assert_non_null(strstr(digest_queue_wait(queue, 3)->fault.text, "folder"));
    digest_queue_free(queue);
    digest_queue_free(NULL);
    unlink(first);
    unlink(second);
    unlink(million);
}

static void test_changed_file(void **unused)
{
    (void)unused;
    char path[32];
    struct digest_mark before, after;
    struct fault fault = {0};
    write_file(path, "1;2\n", 4);
    assert_int_equal(digest_mark(path, &before, &fault), STATUS_DONE);
    assert_int_equal(digest_mark(path, &after, &fault), STATUS_DONE);
    assert_true(digest_mark_equal(&before, &after));
    FILE *file = fopen(path, "a");
    assert_non_null(file);
    fputs("3;4\n", file);
    fclose(file);
    assert_int_equal(digest_mark(path, &after, &fault), STATUS_DONE);
    assert_false(digest_mark_equal(&before, &after));
    unlink(path);
}

/* The count does not depend on how the bytes are cut. */
static void test_lines(void **unused)
{
    (void)unused;
    const char text[] = "a;b\r\n\n1;2\r\n  \n;;;\n3;4\n , \n\n";
    const size_t length = sizeof text - 1;
    for (size_t step = 1; step <= length; step++) {
        struct lines lines = LINES_INIT;
        for (size_t at = 0; at < length; at += step)
            lines_feed(&lines, text + at, at + step < length ? step : length - at);
        lines_finish(&lines);
        assert_int_equal(lines.count, 3);
        assert_int_equal(lines.last_length, 3);
        assert_memory_equal(text + lines.last_offset, "3;4", 3);
    }
    struct lines open = LINES_INIT;
    lines_feed(&open, "1\n2", 3);
    lines_finish(&open);
    assert_int_equal(open.count, 2);
    assert_int_equal(open.last_offset, 2);
    assert_int_equal(open.last_length, 1);
}

int main(void)
{
    const struct CMUnitTest tests[] = {
        cmocka_unit_test(test_queue),
        cmocka_unit_test(test_changed_file),
        cmocka_unit_test(test_lines),
    };
    return cmocka_run_group_tests(tests, NULL, NULL);
}
