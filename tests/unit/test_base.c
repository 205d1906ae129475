/* Options, angles and buffers. */
#include <setjmp.h>
#include <stdarg.h>
#include <stddef.h>
#include <stdint.h>
#include <cmocka.h>

#include <fcntl.h>
#include <math.h>
#include <string.h>
#include <unistd.h>

#include "base/angle.h"
#include "base/buffer.h"
#include "base/nearest.h"
#include "base/options.h"
#include "close_to.h"

struct values {
    bool flag;
    const char *text;
    struct option_list list;
    int choice;
    double number;
};

static int parse(struct values *v, struct option_list *operands, int argc, const char **argv)
{
    static const char *const forms[] = {"text", "csv", NULL};
    const struct option options[] = {
        {"quiet", 'q', OPTION_FLAG, NULL, NULL, 0, 0, NULL, "say less", &v->flag},
        {"output", 'o', OPTION_TEXT, "FILE", NULL, 0, 0, NULL, "where", &v->text},
        {"run", 0, OPTION_LIST, "NAME", NULL, 0, 0, NULL, "which", &v->list},
        {"as", 0, OPTION_CHOICE, "FORM", "text", 0, 0, forms, "form", &v->choice},
        {"speed", 0, OPTION_NUMBER, "rpm", NULL, 1, 100, NULL, "speed", &v->number},
        {NULL, 0, OPTION_FLAG, NULL, NULL, 0, 0, NULL, NULL, NULL}};
    const struct usage usage = {"test", "FILE", "a test", options, 1, 2, NULL};
    return options_parse(&usage, argc, (char **)argv, operands);
}

#define PARSE(...)                                                                                 \
    parse(&v, &operands, (int)(sizeof((const char *[]){"test", __VA_ARGS__}) / sizeof(char *)),    \
          (const char *[]){"test", __VA_ARGS__})

static void test_options(void **state)
{
    (void)state;
    struct values v = {0};
    struct option_list operands;
    assert_int_equal(PARSE("-q", "--output=f", "--run", "a", "--run", "b", "--as", "csv", "--speed",
                           "50", "x", "--", "--y"),
                     OPTIONS_GO);
    assert_true(v.flag);
    assert_string_equal(v.text, "f");
    assert_int_equal(v.list.count, 2);
    assert_string_equal(v.list.items[1], "b");
    assert_int_equal(v.choice, 1);
    assert_close(v.number, 50, 0);
    assert_int_equal(operands.count, 2);
    assert_string_equal(operands.items[1], "--y");
    option_list_release(&v.list);
    option_list_release(&operands);
}

static void test_option_misuse(void **state)
{
    (void)state;
    struct values v = {0};
    struct option_list operands;
    assert_int_equal(PARSE("--nonsense", "x"), OPTIONS_MISUSE);
    option_list_release(&operands);
    assert_int_equal(PARSE("--as", "pdf", "x"), OPTIONS_MISUSE);
    option_list_release(&operands);
    assert_int_equal(PARSE("--speed", "101", "x"), OPTIONS_MISUSE);
    option_list_release(&operands);
    assert_int_equal(PARSE("--speed", "1x", "x"), OPTIONS_MISUSE);
    option_list_release(&operands);
    assert_int_equal(PARSE("--quiet=1", "x"), OPTIONS_MISUSE);
    option_list_release(&operands);
    assert_int_equal(PARSE("--quiet"), OPTIONS_MISUSE);
    option_list_release(&operands);
    assert_int_equal(PARSE("a", "b", "c"), OPTIONS_MISUSE);
    option_list_release(&operands);
    assert_int_equal(PARSE("x", "--output"), OPTIONS_MISUSE);
    option_list_release(&operands);
}

static void test_angles(void **state)
{
    (void)state;
    assert_close(angle_wrap_360(-30), 330, 1e-12);
    assert_close(angle_wrap_360(720), 0, 0);
    assert_close(angle_wrap_360(-1e-17), 0, 0);
    assert_close(angle_wrap_180(181), -179, 1e-12);
    assert_close(angle_wrap_180(180), 180, 0);
    assert_false(signbit(angle_wrap_360(-0.0)));
    assert_true(isnan(angle_wrap_360(NAN)));
    assert_close(angle_of(CMPLX(0, 2)), 90, 1e-12);
    assert_close(angle_of(0), 0, 0);
    assert_close(cimag(angle_vector(2, 30)), 1, 1e-12); /* sin 30 deg = 1/2 */
}

static void test_buffer(void **state)
{
    (void)state;
    struct buffer b = BUFFER_INIT;
    for (int i = 0; i < 1000; i++)
        buffer_format(&b, "%d,", i % 10);
    assert_int_equal(b.length, 2000);
    assert_int_equal(strlen(b.bytes), 2000);
    assert_int_equal(b.failed, 0);
    buffer_release(&b);
    assert_null(b.bytes);
}

/* Distances counted by hand: letters inserted, dropped or changed. */
static void test_nearest(void **state)
{
    (void)state;
    const char *names[] = {"read", "track", "average", "trial 2", "trial 1"};
    char room[NEAREST_ROOM], wide[NEAREST_ROOM];
    assert_string_equal(nearest_hint("trakc", names, 5, room), " (did you mean 'track'?)"); /* 2 */
    assert_string_equal(nearest_hint("READ", names, 5, room), " (did you mean 'read'?)");   /* 0 */
    assert_string_equal(nearest_hint("raed", names, 5, room), " (did you mean 'read'?)");   /* 2 */
    assert_string_equal(nearest_hint("rexyz", names, 5, room), "");                         /* 3 */
    assert_string_equal(nearest_hint("rad", names, 5, room), " (did you mean 'read'?)");    /* 1 */
    assert_string_equal(nearest_hint("ra", names, 5, room), ""); /* 2, of a short word */
    assert_string_equal(nearest_hint("trial 1", names, 5, room), " (did you mean 'trial 1'?)");
    assert_string_equal(nearest_hint("trial 3", names, 5, room), " (did you mean 'trial 2'?)");
    assert_string_equal(nearest_hint("", names, 5, room), "");
    assert_string_equal(nearest_hint("read", names, 0, room), "");
    memset(wide, 'a', sizeof wide);
    wide[sizeof wide - 1] = '\0';
    names[0] = wide;
    assert_string_equal(nearest_hint(wide, names, 1, room), ""); /* fits nowhere */
    assert_string_equal(nearest_file("/no/such/folder/a.wav", room), "");
}

int main(void)
{
    const struct CMUnitTest tests[] = {cmocka_unit_test(test_options),
                                       cmocka_unit_test(test_option_misuse),
                                       cmocka_unit_test(test_angles), cmocka_unit_test(test_buffer),
                                       cmocka_unit_test(test_nearest)};
    dup2(open("/dev/null", O_WRONLY), STDERR_FILENO);
    cmocka_set_message_output(CM_OUTPUT_STDOUT);
    return cmocka_run_group_tests(tests, NULL, NULL);
}
