#include "sheet_desk.h"

#include <setjmp.h>
#include <stdarg.h>
#include <stdint.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>
#include <unistd.h>
#include <cmocka.h>

const char SHEET_DESK_FULL[] = "# a sheet with everything\n"
                               "[job]\n"
                               "title  = Grain dryer, exhaust fan 3\n"
                               "angles = against rotation   # how angles count\n"
                               "phase  = lag\n"
                               "units  = metric\n"
                               "\n"
                               "[rotor]\n"
                               "mass = 340 kg\n"
                               "service speed = 1480 rpm\n"
                               "rotation = clockwise\n"
                               "seen from = drive end\n"
                               "grade = G6.3\n"
                               "support = between bearings\n"
                               "bearing span = 2400 mm\n"
                               "mass centre = 900 mm\n"
                               "\n"
                               "[recording]\n"
                               "full scale = 10 V\n"
                               "rate = 12.8 kHz\n"
                               "time column = Time\n"
                               "separator = semicolon\n"
                               "decimal = comma\n"
                               "skip = 6 lines\n"
                               "\n"
                               "[tacho]\n"
                               "channel = 4\n"
                               "edge = falling\n"
                               "marks = 2\n"
                               "level = 2.5 V\n"
                               "\n"
                               "[sensor DE-V]\n"
                               "channel = 1\n"
                               "unit = g\n"
                               "scale = 100 mV/g\n"
                               "show = mm/s rms\n"
                               "at = 90 deg\n"
                               "[sensor NDE H]\n"
                               "channel = Column two\n"
                               "unit = um\n"
                               "\n"
                               "[plane wheel]\n"
                               "radius = 410 mm\n"
                               "positions = 12 from 10 deg\n"
                               "stock = 4x10 2x20 50 g\n"
                               "pieces = 3\n"
                               "most = 150 g\n"
                               "most in all = 400 g\n"
                               "taken = 3 7\n"
                               "work = add\n"
                               "[plane rim]\n"
                               "radius = 20 in\n"
                               "positions = any\n"
                               "\n"
                               "[run as-found]\n"
                               "file = as-found.wav\n"
                               "file = more/as-found 2.wav\n"
                               "[run trial]\n"
                               "file = trial.csv\n"
                               "when = 2025-03-14 10:40\n"
                               "weight wheel = 60 g at 30 deg radius 205 mm\n"
                               "weight wheel = -20 g at position 2\n"
                               "weight rim = 2 oz at -30 deg\n"
                               "without NDE H = yes\n"
                               "channel DE-V = 3\n"
                               "scale DE-V = 10 mV/(m/s2)\n"
                               "separator = tab\n"
                               "[run by-hand]\n"
                               "speed = 1500 rpm\n"
                               "reading DE-V = 7 mm/s rms at 143 deg\n"
                               "reading NDE H = 30 um pk-pk\n"
                               "condition = hot\n"
                               "\n"
                               "[aim]\n"
                               "target = 1.8 mm/s rms\n"
                               "target NDE H = 20 um pk-pk\n"
                               "minimise = worst\n"
                               "mounted = trial\n"
                               "repeatability = 0 %\n"
                               "tolerance = API 4W/N\n"
                               "\n"
                               "[limits]\n"
                               "speed-match = 2 %\n"
                               "drift = 4 % 18 %\n"
                               "length = 200 50 turns\n"
                               "clipping = none\n"
                               "trial-effect = 25 % 4 s.e.\n";

const char SHEET_DESK_LEAST[] = "[tacho]\n"
                                "channel = 2\n"
                                "[sensor A]\n"
                                "channel = 1\n"
                                "unit = mm/s\n"
                                "[plane w]\n"
                                "radius = 1 m\n"
                                "[run r]\n"
                                "file = r.wav\n";

int sheet_desk_read(struct sheet *sheet, const char *text, size_t length, bool audit,
                    struct buffer *errors)
{
    char folder[200], path[220];
    const char *root = getenv("TMPDIR");
    snprintf(folder, sizeof folder, "%s/sheet-XXXXXX", root ? root : ".");
    assert_non_null(mkdtemp(folder));
    snprintf(path, sizeof path, "%s/fan.ini", folder);
    FILE *file = fopen(path, "wb");
    assert_non_null(file);
    assert_int_equal(fwrite(text, 1, length, file), length);
    assert_int_equal(fclose(file), 0);
    int result = sheet_read(sheet, path, audit, errors);
    assert_int_equal(unlink(path), 0);
    assert_int_equal(rmdir(folder), 0);
    return result;
}

void sheet_desk_expect_bytes(const char *text, size_t length, bool audit, const char *wanted)
{
    struct sheet sheet;
    struct buffer errors = BUFFER_INIT, got = BUFFER_INIT;
    int result = sheet_desk_read(&sheet, text, length, audit, &errors);
    int lines = 0;
    for (char *line = errors.bytes; line && *line; lines++) {
        char *end = strchr(line, '\n'), *name = strstr(line, "fan.ini");
        assert_true(end && name && name < end);
        buffer_add(&got, name, (size_t)(end + 1 - name));
        line = end + 1;
    }
    assert_int_equal(result, lines);
    assert_string_equal(got.bytes ? got.bytes : "", wanted);
    sheet_release(&sheet);
    buffer_release(&errors);
    buffer_release(&got);
}

void sheet_desk_expect(const char *text, bool audit, const char *wanted)
{
    sheet_desk_expect_bytes(text, strlen(text), audit, wanted);
}

char *sheet_desk_swap(const char *text, const char *old, const char *new)
{
    const char *at = strstr(text, old);
    if (!at)
        fail_msg("no such text: '%s'", old);
    size_t room = strlen(text) + strlen(new) + 1;
    char *made = malloc(room);
    assert_non_null(made);
    snprintf(made, room, "%.*s%s%s", (int)(at - text), text, new, at + strlen(old));
    return made;
}

int sheet_desk_line(const char *text, const char *start)
{
    int line = 1;
    for (const char *at = text; at; line++) {
        if (!strncmp(at, start, strlen(start)))
            return line;
        at = strchr(at, '\n');
        at = at ? at + 1 : NULL;
    }
    fail_msg("no such line: '%s'", start);
    return 0;
}
