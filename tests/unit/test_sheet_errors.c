/* Bad sheets: each mistake is one error with its own line, and all of a sheet are told at once. */
#include <stdarg.h>
#include <stddef.h>
#include <stdint.h>
#include <stdio.h>
#include <setjmp.h>
#include <stdlib.h>
#include <string.h>
#include <cmocka.h>

#include "sheet_desk.h"

struct mistake {
    const char *old, *new; /* what is replaced in the full sheet */
    const char *line;      /* the beginning of the line to blame, as it stands then */
    const char *wanted;    /* the whole message behind file and line */
};

/* Keys, sections, names. */
static const struct mistake NAMES[] = {
    {"title  =", "titel =", "titel", "unknown key in [job]: 'titel' (did you mean 'title'?)"},
    {"phase  =", "Phase =\"lag\"\nphase =", "Phase",
     "unknown key in [job]: 'Phase' (did you mean 'phase'?)"},
    {"[tacho]", "[takko]\nx = 1\n[tacho]", "[takko]",
     "unknown section: '[takko]' (did you mean 'tacho'?)"},
    {"[aim]", "[valve]\nlift = 3 mm\n[aim]", "[valve]", "unknown section: '[valve]'"},
    {"[aim]", "[sensor X]\n[aim]", "[sensor X]", "missing: 'channel' and 'unit' in '[sensor X]'"},
    {"[aim]", "[run X]\n[aim]", "[run X]", "empty section: '[run X]'"},
    {"[aim]", "[sensor]\nunit = g\n[aim]", "[sensor]", "no name: '[sensor]'"},
    {"[aim]", "[sensor a:b]\nunit = g\n[aim]", "[sensor a:b]",
     "a name may hold none of ':', '=', ';', '#', ']': '[sensor a:b]'"},
    {"[aim]", "[sensor tacho]\nchannel = 9\nunit = g\n[aim]", "[sensor tacho]",
     "name is taken by the tacho: '[sensor tacho]'"},
    {"[aim]", "[aim x]", "[aim x]", "section takes no name: '[aim x]'"},
    {"[aim]", "[aim", "[aim", "section header without ']': '[aim'"},
    {"[aim]", "[aim] x", "[aim", "text behind a section header: ' x'"},
    {"pieces = 3", "pieces = 3\npieces = 4", "pieces = 4",
     "key given twice: 'pieces' (first in line 46)"},
    {"scale DE-V", "channel  DE-V = 3\nscale DE-V", "channel  DE-V",
     "key given twice: 'channel  DE-V' (first in line 65)"},
    {"[limits]", "[aim]\nminimise = total\n[limits]", NULL, NULL}, /* see test_doubled */
    {"weight rim", "weight tim", "weight tim", "no such plane: 'tim' (did you mean 'rim'?)"},
    {"weight rim", "weight", "weight =", "a plane's name must stand behind the key: 'weight'"},
    {"without NDE H", "without H", "without H", "no such sensor: 'H'"},
    {"target NDE H", "target DEV", "target DEV", "no such sensor: 'DEV' (did you mean 'DE-V'?)"},
    {"mounted = trial", "mounted = trail", "mounted",
     "no such run: 'trail' (did you mean 'trial'?)"},
    {"speed-match", "speedmatch", "speedmatch",
     "unknown key in [limits]: 'speedmatch' (did you mean 'speed-match'?)"},
    {"condition = hot", "role = run-out", "role",
     "not one of 'runout', 'coast-down': 'role = run-out'"},
    {"condition = hot", "role = runout\nspeeds = 900 rpm", "speeds",
     "only with 'role = coast-down': 'speeds = 900 rpm'"},
    {"condition = hot", "speeds = 900 rpm", "speeds",
     "only with 'role = coast-down': 'speeds = 900 rpm'"},
    {"when = 2025-03-14 10:40", "role = coast-down", "[run trial]",
     "missing key in [run trial]: 'speeds'"},
    {"when = 2025-03-14 10:40", "role = coast-down\nspeeds = 900 1100", "speeds",
     "no unit, wanted rpm: 'speeds = 900 1100'"},
    {"when = 2025-03-14 10:40", "role = coast-down\nspeeds = 0 900 rpm", "speeds",
     "speed out of range (more than 0, at most 1e6 rpm): 'speeds = 0 900 rpm'"},
    {"when = 2025-03-14 10:40", "role = coast-down\nspeeds = 900 700 900 rpm", "speeds",
     "speed given twice: 'speeds = 900 700 900 rpm'"},
    {"when = 2025-03-14 10:40",
     "role = coast-down\nspeeds = 900 rpm\ncondition = a condition with a rather long name",
     "speeds", "condition too long with a speed behind it (40 bytes in all): 'speeds = 900 rpm'"},
    {"condition = hot", "role = coast-down\nspeeds = 900 rpm", "role",
     "needs a recording, readings by hand have no sweep: 'role = coast-down'"},
    {"minimise = worst", "zones = group 3 rigid", "zones",
     "not one of 'group 1 rigid', 'group 1 flexible', 'group 2 rigid', 'group 2 flexible': 'zones "
     "= group 3 rigid'"},
    {"minimise = worst", "responses = r.jsonl", "responses",
     "cannot be opened, No such file or directory: 'responses = r.jsonl'"},
    {"minimise = worst", "importance cold = 2", "importance",
     "no run has that condition: 'importance cold = 2'"},
    {"minimise = worst", "importance = 2", "importance",
     "a condition's name must stand behind the key: 'importance'"},
    {"minimise = worst", "importance hot = 0", "importance",
     "out of range (more than 0, at most 1000): 'importance hot = 0'"},
    {"work = add", "work = remove\nhole = 10 mm", "hole",
     "needs the key 'density', too: 'hole = 10 mm'"},
    {"work = add", "work = remove\ndensity = 7.85 g/cm3", "density",
     "needs the key 'hole', too: 'density = 7.85 g/cm3'"},
    {"work = add", "work = remove\ndepth = 1 in", "depth",
     "needs the keys 'hole' and 'density', too: 'depth = 1 in'"},
    {"work = add", "work = remove\nhole = 10 mm\ndensity = 7.85 g", "density",
     "unit does not fit, wanted kg/m3, kg/dm3, g/cm3 or lb/in3: 'density = 7.85 g'"},
};

/* Numbers, units, ranges, choices. */
static const struct mistake VALUES[] = {
    {"mass = 340 kg", "mass = 340", "mass", "no unit, wanted g, kg, oz or lb: 'mass = 340'"},
    {"mass = 340 kg", "mass = 340 mm", "mass",
     "unit does not fit, wanted g, kg, oz or lb: 'mass = 340 mm'"},
    {"mass = 340 kg", "mass = heavy", "mass", "not a number: 'mass = heavy'"},
    {"mass = 340 kg", "mass = nan kg", "mass", "not a number: 'mass = nan kg'"},
    {"mass = 340 kg", "mass = inf kg", "mass", "not a number: 'mass = inf kg'"},
    {"mass = 340 kg", "mass = 0x1p4 kg", "mass",
     "unit does not fit, wanted g, kg, oz or lb: 'mass = 0x1p4 kg'"},
    {"mass = 340 kg", "mass = 1e999 kg", "mass", "number too large: 'mass = 1e999 kg'"},
    {"mass = 340 kg", "mass = 340,5 kg", "mass",
     "a number is written with a decimal point, lists with blanks: 'mass = 340,5 kg'"},
    {"positions = 12 from 10 deg", "positions = 0;120;240 deg", "positions",
     "a list is written with blanks between its items: 'positions = 0;120;240 deg'"},
    {"mass = 340 kg", "mass = 340 kg net", "mass", "text behind the value: 'mass = 340 kg net'"},
    {"mass = 340 kg", "mass = 0 kg", "mass",
     "out of range (more than 0, at most 1000 t): 'mass = 0 kg'"},
    {"service speed = 1480 rpm", "service speed = -1480 rpm", "service",
     "out of range (more than 0, at most 1e6 rpm): 'service speed = -1480 rpm'"},
    {"rotation = clockwise", "rotation = right", "rotation = right",
     "not one of 'clockwise', 'counter-clockwise': 'rotation = right'"},
    {"grade = G6.3", "grade = 6.3", "grade", "not a grade, wanted G and a number: 'grade = 6.3'"},
    {"grade = G6.3", "grade = G0", "grade",
     "out of range (more than G0, at most G4000): 'grade = G0'"},
    {"mass centre = 900 mm", "mass centre = 2500 mm", "mass centre",
     "not between the bearings: 'mass centre = 2500 mm'"},
    {"mass centre = 900 mm\n", "", "bearing span",
     "needs the key 'mass centre' beside it: 'bearing span = 2400 mm'"},
    {"support = between bearings\n", "", "bearing span",
     "needs the key 'support' beside it: 'bearing span = 2400 mm'"},
    {"rate = 12.8 kHz", "rate = 12.8 rpm", "rate",
     "unit does not fit, wanted Hz or kHz: 'rate = 12.8 rpm'"},
    {"time column = Time", "time column = 0", "time column",
     "out of range (1 to 4096): 'time column = 0'"},
    {"time column = Time", "time column = \" \"", "time column", "no value: 'time column'"},
    {"separator = semicolon", "separator = ;", "separator",
     "not one of 'comma', 'semicolon', 'tab': 'separator = ;'"},
    {"separator = semicolon", "separator = comma", "decimal",
     "separator and decimal sign are both a comma: 'decimal = comma'"},
    {"skip = 6 lines", "skip = 6", "skip", "unit does not fit, wanted lines: 'skip = 6'"},
    {"skip = 6 lines", "skip = 6.5 lines", "skip", "not a whole number: 'skip = 6.5 lines'"},
    {"marks = 2", "marks = 0", "marks", "out of range (1 to 10000): 'marks = 0'"},
    {"level = 2.5 V", "level = 2.5 g", "level",
     "unit does not fit, wanted V or mV: 'level = 2.5 g'"},
    {"channel = 1\n", "channel = 0\n", "channel = 0", "out of range (1 to 4096): 'channel = 0'"},
    {"unit = um", "unit = bar", "unit = bar",
     "unit does not fit, wanted g, m/s2, mm/s, in/s, um or mil: 'unit = bar'"},
    {"scale = 100 mV/g", "scale = 100 mV/(mm/s)", "scale",
     "scale and unit of the sensor are not the same quantity: 'scale = 100 mV/(mm/s)'"},
    {"scale = 100 mV/g", "scale = 100 g/V", "scale",
     "unit does not fit, wanted mV/g, mV/(mm/s), V/(m/s2), mV/um or the like: 'scale = 100 g/V'"},
    {"scale = 100 mV/g", "scale = 0 mV/g", "scale", "a scale of zero: 'scale = 0 mV/g'"},
    {"scale DE-V = 10 mV/(m/s2)", "scale DE-V = 10 mV/um", "scale DE-V",
     "scale and unit of the sensor are not the same quantity: 'scale DE-V = 10 mV/um'"},
    {"show = mm/s rms", "show = mm/s", "show",
     "not a unit with pk, pk-pk or rms behind it: 'show = mm/s'"},
    {"repeatability = 0 %", "repeatability = -1 %", "repeatability",
     "out of range (0 to 100 %): 'repeatability = -1 %'"},
    {"target = 1.8 mm/s rms", "target = 1.8 mm/s",
     "target =", "no detection behind the unit, wanted pk, pk-pk or rms: 'target = 1.8 mm/s'"},
    {"target = 1.8 mm/s rms", "target = 1.8 kg rms",
     "target =", "unit does not fit, wanted g, m/s2, mm/s, in/s, um or mil: 'target = 1.8 kg rms'"},
    {"speed-match = 2 %", "speed-match = 2", "speed-match", "no unit, wanted %: 'speed-match = 2'"},
    {"speed-match = 2 %", "speed-match = 2 deg", "speed-match",
     "unit does not fit, wanted %: 'speed-match = 2 deg'"},
    {"speed-match = 2 %", "speed-match = 3 % 2 %", "speed-match",
     "caution before refusal: the second figure must not be smaller: 'speed-match = 3 % 2 %'"},
    {"length = 200 50 turns", "length = 20 50 turns", "length",
     "caution before refusal: the second figure must not be larger: 'length = 20 50 turns'"},
    {"clipping = none", "sensor-dead = 3 %", "sensor-dead",
     "the check has no figure, only 'none' is possible: 'sensor-dead = 3 %'"},
    {"trial-effect = 25 % 4 s.e.", "trial-effect = 25 % 30 %", "trial-effect",
     "two figures of the same unit, wanted % or s.e.: 'trial-effect = 25 % 30 %'"},
};

/* Planes, runs, and what concerns several sections. */
static const struct mistake RELATIONS[] = {
    {"radius = 410 mm\n", "", "[plane wheel]", "missing key in [plane wheel]: 'radius'"},
    {"unit = um\n", "", "[sensor NDE H]", "missing key in [sensor NDE H]: 'unit'"},
    {"channel = 1\n", "", "[sensor DE-V]", "missing key in [sensor DE-V]: 'channel'"},
    {"channel = 4\n", "", "[tacho]", "missing key in [tacho]: 'channel'"},
    {"positions = 12 from 10 deg", "positions = 12 at 10 deg", "positions",
     "unit does not fit, wanted deg: 'positions = 12 at 10 deg'"},
    {"12 from 10 deg", "12 from 10", "positions", "no unit, wanted deg: 'positions = 12 from 10'"},
    {"12 from 10 deg", "1001 from 10 deg", "positions",
     "number of positions out of range (1 to 1000): 'positions = 1001 from 10 deg'"},
    {"12 from 10 deg", "12 from 10 deg, numbered right", "positions",
     "numbered how? wanted 'with rotation' or 'against rotation': "
     "'positions = 12 from 10 deg, numbered right'"},
    {"12 from 10 deg", "0 90 180 20 200 220 360 deg", "positions",
     "position given twice: 'positions = 0 90 180 20 200 220 360 deg'"},
    {"12 from 10 deg", "0 9 18 20 200 220 36 deg, numbered with rotation", "positions",
     "a list is numbered as listed: "
     "'positions = 0 9 18 20 200 220 36 deg, numbered with rotation'"},
    {"4x10 2x20 50 g", "10 10 g", "stock", "piece listed twice: 'stock = 10 10 g'"},
    {"4x10 2x20 50 g", "0x10 g", "stock", "count out of range: 'stock = 0x10 g'"},
    {"4x10 2x20 50 g", "10 -20 g", "stock",
     "out of range (a piece is more than 0, at most 100 t): 'stock = 10 -20 g'"},
    {"4x10 2x20 50 g", "10 20", "stock", "no unit, wanted g, kg, oz or lb: 'stock = 10 20'"},
    {"pieces = 3", "pieces = 65", "pieces", "out of range (1 to 64): 'pieces = 65'"},
    {"taken = 3 7", "taken = 3 13", "taken", "no such position: 'taken = 3 13'"},
    {"taken = 3 7", "taken = 3 3", "taken", "position given twice: 'taken = 3 3'"},
    {"positions = any", "positions = any\ntaken = 1", "taken = 1",
     "the plane has no numbered positions: 'taken = 1'"},
    {"at position 2", "at position 13", "weight wheel = -20",
     "the plane has no such position (1 to 12): 'weight wheel = -20 g at position 13'"},
    {"at position 2", "at pos 2", "weight wheel = -20",
     "wanted 'MASS at ANGLE deg' or 'MASS at position N': 'weight wheel = -20 g at pos 2'"},
    {"rim = 2 oz at -30 deg", "rim = 2 oz at position 1", "weight rim",
     "the plane has no numbered positions: 'weight rim = 2 oz at position 1'"},
    {"rim = 2 oz at -30 deg", "rim = 2 oz", "weight rim",
     "wanted 'MASS at ANGLE deg' or 'MASS at position N': 'weight rim = 2 oz'"},
    {"rim = 2 oz at -30 deg", "rim = 2 oz at 400 deg", "weight rim",
     "angle out of range (-360 to 360 deg): 'weight rim = 2 oz at 400 deg'"},
    {"radius 205 mm", "radius 0 mm", "weight wheel = 60",
     "radius out of range (more than 0, at most 100 m): "
     "'weight wheel = 60 g at 30 deg radius 0 mm'"},
    {"angles = against rotation   # how angles count\n", "", "[job]",
     "missing key in [job]: 'angles' (needed for 'weight wheel' in line 60)"},
    {"phase  = lag\n", "", "[job]",
     "missing key in [job]: 'phase' (needed for 'reading DE-V' in line 69)"},
    {"speed = 1500 rpm\n", "", "[run by-hand]", "missing key in [run by-hand]: 'speed'"},
    {"speed = 1500 rpm", "speed = 1500 rpm\nfile = x.wav", "[run by-hand]",
     "a run has either recordings or readings by hand, not both: '[run by-hand]'"},
    {"file = trial.csv\n", "", "[run trial]", "neither a 'file' nor a 'reading' in: '[run trial]'"},
    {"file = trial.csv", "file = trial.csv\nspeed = 3 rpm", "speed",
     "for readings by hand; a recording brings its own speed: 'speed = 3 rpm'"},
    {"file = trial.csv", "file = trial.csv\nfile = trial.csv", NULL, NULL}, /* see test_again */
    {"without NDE H = yes", "without NDE H = yes\nwithout DE-V = yes", "[run trial]",
     "a run without any sensor: '[run trial]'"},
    {"without NDE H = yes", "without NDE H = maybe", "without",
     "not one of 'yes', 'no': "
     "'without NDE H = maybe'"},
    {"channel = Column two", "channel = 1", "channel = 1\nunit = um",
     "same channel as sensor 'DE-V': '1'"},
    {"channel = Column two", "channel = 04", "channel = 04", "same channel as the tacho: '4'"},
    {"channel DE-V = 3", "channel DE-V = 4", "channel DE-V", "same channel as the tacho: '4'"},
    {"reading NDE H = 30 um pk-pk", "reading NDE H = 30 um pk-pk at 400 deg", "reading NDE",
     "phase out of range (-360 to 360 deg): 'reading NDE H = 30 um pk-pk at 400 deg'"},
    {"reading NDE H = 30 um pk-pk", "reading NDE H = -3 um pk", "reading NDE",
     "amplitude out of range (0 to 1e6): 'reading NDE H = -3 um pk'"},
    {"reading NDE H = 30 um pk-pk", "reading NDE H = 30 um pk-pk\nwithout NDE H = yes",
     "reading NDE", "a reading of a sensor that the run is without: 'reading NDE H = 30 um pk-pk'"},
    {"mass = 340 kg\n", "", "tolerance", "needs the key 'mass' in [rotor]: 'tolerance = API 4W/N'"},
};

static void check(const struct mistake *m)
{
    struct sheet sheet;
    struct buffer errors = BUFFER_INIT;
    char *text = sheet_desk_swap(SHEET_DESK_FULL, m->old, m->new);
    char wanted[500];
    int result = sheet_desk_read(&sheet, text, strlen(text), false, &errors);
    snprintf(wanted, sizeof wanted, "fan.ini:%d: %s\n", sheet_desk_line(text, m->line), m->wanted);
    const char *got = errors.bytes ? strstr(errors.bytes, "fan.ini") : NULL;
    if (result < 1 || !got || !strstr(errors.bytes, wanted))
        fail_msg("'%s':\ngot    %swanted %s", m->new, got ? got : "nothing\n", wanted);
    /* One mistake is one message, but where a section is lost and others name it. */
    if (result != 1 && m->line[0] != '[' && strncmp(m->line, "positions", 9))
        fail_msg("'%s': more than one message:\n%s", m->new, errors.bytes);
    sheet_release(&sheet);
    buffer_release(&errors);
    free(text);
}

static void check_all(const struct mistake *mistakes, size_t count)
{
    for (size_t i = 0; i < count; i++)
        if (mistakes[i].line)
            check(&mistakes[i]);
}

#define COUNT(array) (sizeof(array) / sizeof((array)[0]))

static void test_names(void **state)
{
    (void)state;
    check_all(NAMES, COUNT(NAMES));
}

static void test_values(void **state)
{
    (void)state;
    check_all(VALUES, COUNT(VALUES));
}

static void test_relations(void **state)
{
    (void)state;
    check_all(RELATIONS, COUNT(RELATIONS));
}

/* All of them, in the order of lines, though they are found in another. */
static void test_all_at_once(void **state)
{
    (void)state;
    sheet_desk_expect(
        "stray = 1\n"               /* 1 */
        "[job]\n"                   /* 2 */
        "titel = x\n"               /* 3 */
        "angles = up\n"             /* 4 */
        "[limits]\n"                /* 5 */
        "drift = 3 kg\n"            /* 6 */
        "[aim]\n"                   /* 7 */
        "mounted = nothing\n"       /* 8 */
        "[sensor A]\n"              /* 9 */
        "unit = kg\n"               /* 10 */
        "[rotor]\n"                 /* 11 */
        "mass = 1 m\n"              /* 12 */
        "just text\n"               /* 13 */
        "[plane w]\n"               /* 14 */
        "stock = 10,5 g\n"          /* 15 */
        "[run r]\n"                 /* 16 */
        "file = a.wav\n"            /* 17 */
        "weight v = 3 g at 3 deg\n" /* 18 */
        "[run r]\n"                 /* 19 */
        "file = b.wav\n",           /* 20 */
        false,
        "fan.ini:1: key before any section: 'stray'\n"
        "fan.ini:3: unknown key in [job]: 'titel' (did you mean 'title'?)\n"
        "fan.ini:4: not one of 'against rotation', 'with rotation': 'angles = up'\n"
        "fan.ini:6: unit does not fit, wanted %: 'drift = 3 kg'\n"
        "fan.ini:8: no such run: 'nothing'\n"
        "fan.ini:9: missing key in [sensor A]: 'channel'\n"
        "fan.ini:10: unit does not fit, wanted g, m/s2, mm/s, in/s, um or mil: 'unit = kg'\n"
        "fan.ini:12: unit does not fit, wanted g, kg, oz or lb: 'mass = 1 m'\n"
        "fan.ini:13: neither a section nor 'key = value'\n"
        "fan.ini:14: missing key in [plane w]: 'radius'\n"
        "fan.ini:15: a number is written with a decimal point, lists with blanks: "
        "'stock = 10,5 g'\n"
        "fan.ini:18: no such plane: 'v'\n"
        "fan.ini:19: section given twice: '[run r]' (first in line 16)\n");
}

static void test_doubled(void **state)
{
    (void)state;
    sheet_desk_expect(
        "[tacho]\nchannel = 2\n[sensor A]\nchannel = 1\nunit = g\n[plane w]\nradius = 1 m\n"
        "[run r]\nfile = a\n[sensor A]\nunit = um\n[tacho]\nedge = rising\n",
        false,
        "fan.ini:10: section given twice: '[sensor A]' (first in line 3)\n"
        "fan.ini:11: key given twice: 'unit' (first in line 5)\n"
        "fan.ini:12: section given twice: '[tacho]' (first in line 1)\n");
}

static void test_again(void **state)
{
    (void)state;
    sheet_desk_expect(
        "[tacho]\nchannel = 2\n[sensor A]\nchannel = 1\nunit = g\n[plane w]\nradius = 1 m\n"
        "[run r]\nfile = a\nfile = b\nfile = a\n",
        false, "fan.ini:11: file given twice in one run: 'file = a'\n");
    sheet_desk_expect("[sensor A]\nunit = g\n[plane w]\nradius = 1 m\n[run r]\nspeed = 9 rpm\n"
                      "weight w = 1 g at 0 deg\nreading A = 1 g pk\nreading A = 1 g pk\n",
                      false,
                      "fan.ini:7: missing section '[job]', which must say 'angles' for: "
                      "'weight w = 1 g at 0 deg'\n"
                      "fan.ini:9: key given twice: 'reading A' (first in line 8)\n");
}

static void test_audit(void **state)
{
    (void)state;
    sheet_desk_expect("[sensor A]\nunit = g\n[sensor B]\nunit = g\nchannel = 1\n[sensor C]\nunit = "
                      "g\nchannel = 1\n",
                      true,
                      "fan.ini:1: missing key in [sensor A]: 'channel'\n"
                      "fan.ini:8: same channel as sensor 'B': '1'\n");
}

int main(void)
{
    const struct CMUnitTest tests[] = {
        cmocka_unit_test(test_names),     cmocka_unit_test(test_values),
        cmocka_unit_test(test_relations), cmocka_unit_test(test_all_at_once),
        cmocka_unit_test(test_doubled),   cmocka_unit_test(test_again),
        cmocka_unit_test(test_audit)};
    return cmocka_run_group_tests(tests, NULL, NULL);
}
