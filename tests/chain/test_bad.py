"""test_bad.py - the bad-input battery: the right exit code, one clear line, no placement.

Recordings that cannot be read: 3. Recordings that can be read but not balanced on: 4. Sheets: 2, one line per
error with its line number.
"""
import json
import math
import random
import struct
import unittest

import chain
import jobs


def small(form, **recording):
    return jobs.job(91, 1, form, "against rotation", left_on=False, seconds=6, rate_hz=2048, **recording)


def placements(value):
    """Any placement in a JSON report, however deep."""
    if isinstance(value, dict):
        if value.get("kind") == "placement":
            return True
        return any((k == "placement" and v) or placements(v) for k, v in value.items())
    return isinstance(value, list) and any(placements(v) for v in value)


class Battery(unittest.TestCase):
    def refuse(self, where, codes, lines=1):
        """Runs balance; gives what it said. lines None: one or more."""
        done = chain.lopside("balance", where / "job.ini", "--as", "json")
        said = chain.complaint(done)
        self.assertIn(done.returncode, codes, said)
        for line in said.splitlines():
            self.assertRegex(line, r"^lopside \w+: \S")
            self.assertLess(len(line), 600)
        if lines is None:
            self.assertTrue(said)
        else:
            self.assertEqual(len(said.splitlines()), lines, said)
        if done.stdout:
            self.assertFalse(placements(json.loads(done.stdout)))
        text = chain.lopside("balance", where / "job.ini")
        self.assertEqual(text.returncode, done.returncode)
        if done.returncode in (2, 3):
            self.assertEqual(text.stdout, b"")
        return said


class BadSound(Battery):
    def broken(self, change, codes, lines=1, form="wav", name="trial-1.wav", said=None, **recording):
        with chain.folder() as where:
            chain.simulate(small(form, **recording), where)
            change(where / name)
            text = self.refuse(where, codes, lines)
            self.assertNotIn(str(where) + "/" + str(where), text)
            self.assertIn(said if said is not None else name, text)

    def bytes(self, change, **more):
        self.broken(lambda p: p.write_bytes(change(p.read_bytes())), [3], **more)

    def test_good(self):
        with chain.folder() as where:
            chain.simulate(small("wav"), where)
            done = chain.lopside("balance", where / "job.ini", "--as", "json")
            self.assertEqual(done.returncode, 0, chain.complaint(done))
            self.assertTrue(placements(json.loads(done.stdout)))  # the battery can fail

    def test_cut(self):
        for keep in (0.98, 0.6, 0.05):
            self.bytes(lambda b, keep=keep: b[:int(len(b) * keep)])

    def test_cut_by_one_frame(self):
        self.bytes(lambda b: b[:-9])

    def test_cut_flac(self):
        self.bytes(lambda b: b[:len(b) // 2], form="flac", name="trial-1.flac")

    def test_empty(self):
        self.bytes(lambda b: b"")

    def test_header_only(self):
        self.bytes(lambda b: b[:44])

    def test_no_frames(self):
        self.bytes(lambda b: b[:4] + struct.pack("<I", 36) + b[8:40] + struct.pack("<I", 0), bits=16)

    def test_wrong_header(self):
        self.bytes(lambda b: b"WAVE" + b[4:])

    def test_wrong_format(self):
        self.bytes(lambda b: b[:20] + b"\xff\xff" + b[22:], bits=16)

    def test_junk(self):
        self.bytes(lambda b: bytes(random.Random(3).randbytes(50000)))

    def test_text_file(self):
        self.bytes(lambda b: b"this is not a recording\n" * 100)

    def test_nan(self):
        nan = struct.pack("<f", math.nan)
        self.bytes(lambda b: b[:len(b) // 24 * 12] + nan + b[len(b) // 24 * 12 + 4:], bits=0)

    def test_missing_file(self):
        self.broken(lambda p: p.unlink(), [3])

    def test_folder_instead_of_file(self):
        self.broken(lambda p: (p.unlink(), p.mkdir()), [3])

    def edit(self, old, new, **more):
        def change(path):
            sheet = path.parent / "job.ini"
            text = sheet.read_text()
            self.assertIn(old, text)
            sheet.write_text(text.replace(old, new, 1))
        self.broken(change, **more)

    def test_missing_channel(self):
        self.edit("channel = 2", "channel = 9", codes=[3], said="9")

    def test_one_channel_for_two(self):
        self.edit("channel = 3", "channel = 1", codes=[2], said="job.ini")

    def test_same_recording_twice(self):
        self.broken(lambda p: p.write_bytes((p.parent / "as-found.wav").read_bytes()), [4], None, said="same")

    def test_no_tacho_pulse(self):
        spec = small("wav")
        spec["tacho"] |= {"high_v": spec["tacho"]["low_v"], "noise_v": 0}
        self.simulated(spec, "tacho")

    def test_tacho_noise_only(self):
        spec = small("wav")
        spec["tacho"] |= {"high_v": spec["tacho"]["low_v"], "noise_v": 0.05}
        self.simulated(spec, "")

    def test_constant(self):
        spec = small("wav")
        spec["modes"] = [dict(m, sensors=[0, 0]) for m in spec["modes"]]
        for s in spec["sensors"]:
            s |= {"white": 0, "coloured": 0, "orders": [], "lines": []}
        self.simulated(spec, "")

    def test_clipped(self):
        spec = small("wav")
        for s in spec["sensors"]:
            s["v_per_unit"] *= 60
            s["offset"] = 0
        self.simulated(spec, "")

    def test_too_short(self):
        self.simulated(small("wav", ) | {"recording": small("wav")["recording"] | {"seconds": 0.6}}, "")

    def simulated(self, spec, said):
        with chain.folder() as where:
            chain.simulate(spec, where)
            text = self.refuse(where, [4], None)
            self.assertIn(said, text)


class BadText(Battery):
    def lines(self, change, codes=(3,), where_line=None):
        """change: list of the file's lines -> list; where_line: line number that must be named."""
        with chain.folder() as where:
            spec = small("csv")
            spec["recording"]["csv"] = {"separator": ";", "decimal": ",", "time_name": "Time", "time_digits": 7,
                                        "tacho_digits": 3}
            spec["sheet"]["recording"] = []
            chain.simulate(spec, where)
            path = where / "trial-1.csv"
            rows = path.read_text().splitlines(keepends=True)
            path.write_bytes("".join(change(rows)).encode("latin-1"))
            said = self.refuse(where, codes)
            self.assertIn("trial-1.csv", said)
            if where_line:
                self.assertRegex(said, rf"\b{where_line}\b")

    def at(self, number, change, **more):
        """Changes the line with that number (from 1)."""
        self.lines(lambda rows: rows[:number - 1] + [change(rows[number - 1])] + rows[number:], where_line=number,
                   **more)

    def test_good(self):
        with self.assertRaises(AssertionError):
            self.lines(lambda rows: rows)

    def test_ragged_short(self):
        self.at(500, lambda row: row.rsplit(";", 1)[0] + "\n")

    def test_ragged_long(self):
        self.at(777, lambda row: row.rstrip("\n") + ";1,0\n")

    def test_cut_in_a_row(self):
        self.lines(lambda rows: [*rows[:-1], rows[-1][:12]])

    def test_not_a_number(self):
        self.at(1234, lambda row: row.rsplit(";", 1)[0] + ";off\n")

    def test_nan(self):
        self.at(1000, lambda row: row.rsplit(";", 1)[0] + ";nan\n")

    def test_infinity(self):
        self.at(1000, lambda row: row.rsplit(";", 1)[0] + ";inf\n")

    def test_empty_cell(self):
        self.at(1000, lambda row: row.split(";")[0] + ";" + ";".join(["", *row.split(";")[2:]]))

    def test_uneven_time(self):
        self.at(3000, lambda row: "9,5;" + row.split(";", 1)[1])

    def test_time_stands_still(self):
        self.lines(lambda rows: rows[:2000] + [rows[1999].split(";")[0] + ";" + rows[2000].split(";", 1)[1]]
                   + rows[2001:])

    def test_rows_missing(self):
        self.lines(lambda rows: rows[:2000] + rows[2400:])

    def test_column_missing(self):
        self.lines(lambda rows: [rows[0].replace("B-H", "X-X")] + rows[1:])

    def test_empty(self):
        self.lines(lambda rows: [])

    def swapped(self, names):
        """The first sensor's cable in the tacho's socket and the other way round, in the recordings named."""
        with chain.folder() as where:
            chain.simulate(small("csv"), where)
            for name in names:
                path = where / name
                text = path.read_text("utf-8-sig")
                self.assertEqual((text.count("A-H"), text.count("Tacho")), (1, 1))
                path.write_text(text.replace("Tacho", "?").replace("A-H", "Tacho").replace("?", "A-H"))
            self.refuse(where, (3, 4), None)

    def test_swapped_in_one_run(self):
        self.swapped(["trial-1.csv"])

    def test_swapped_in_all_runs(self):
        self.swapped(["as-found.csv", "trial-1.csv"])

    def test_header_only(self):
        self.lines(lambda rows: rows[:1])

    def test_junk(self):
        self.lines(lambda rows: [random.Random(4).randbytes(40000).decode("latin-1")])

    def test_nul_bytes(self):
        self.lines(lambda rows: rows[:900] + ["\0\0\0\0;\0;\0\n"] + rows[900:])

    def test_open_quote(self):
        self.lines(lambda rows: rows[:900] + ['"' + rows[900]] + rows[901:])

    def test_an_endless_line(self):
        self.lines(lambda rows: rows[:900] + ["1" * (20 << 20) + "\n"] + rows[900:])


GOOD = """[job]
title = Sheet battery
angles = against rotation
phase = lag

[rotor]
mass = 900 kg
service speed = 1500 rpm

[sensor DE]
unit = mm/s
show = mm/s rms

[plane wheel]
radius = 300 mm
positions = 12 from 0 deg

[run as-found]
speed = 1500 rpm
reading DE = 5 mm/s rms at 40 deg

[run trial]
speed = 1500 rpm
weight wheel = 40 g at 30 deg
reading DE = 6 mm/s rms at 110 deg
"""


class BadSheet(Battery):
    def sheet(self, text, lines, numbers=()):
        with chain.folder() as where:
            (where / "job.ini").write_bytes(text if isinstance(text, bytes) else text.encode())
            said = self.refuse(where, [2], lines)
            self.assertIn("job.ini", said)
            for number in numbers:
                self.assertRegex(said, rf"job\.ini:{number}:", said)

    def change(self, old, new, lines=1, number=None):
        self.assertEqual(GOOD.count(old), 1, old)
        line = GOOD[:GOOD.index(old)].count("\n") + 1
        self.sheet(GOOD.replace(old, new), lines, [number if number is not None else line] if lines else [])

    def test_good(self):
        with chain.folder() as where:
            (where / "job.ini").write_text(GOOD)
            done = chain.lopside("balance", where / "job.ini", "--as", "json")
            self.assertEqual(done.returncode, 0, chain.complaint(done))
            self.assertTrue(placements(json.loads(done.stdout)))

    def test_empty(self):
        self.sheet("", None)

    def test_junk(self):
        self.sheet(random.Random(6).randbytes(3000), None)

    def test_missing(self):
        done = chain.lopside("balance", "no-such-sheet.ini")
        self.assertEqual((done.returncode, done.stdout), (2, b""))
        self.assertEqual(len(chain.complaint(done).splitlines()), 1)
        self.assertIn("no-such-sheet.ini", chain.complaint(done))

    def test_unknown_key(self):
        self.change("mass = 900 kg", "mass = 900 kg\nweigth = 3 g", number=8)

    def test_unknown_section(self):
        self.change("[rotor]", "[motor]\nmass = 2 kg\n[rotor]", None)

    def test_doubled_key(self):
        self.change("service speed = 1500 rpm", "service speed = 1500 rpm\nmass = 900 kg", number=9)

    def test_doubled_section(self):
        self.change("[plane wheel]", "[sensor DE]\nunit = mm/s\n[plane wheel]", None)

    def test_empty_section(self):
        self.change("[plane wheel]", "[aim]\n[plane wheel]")

    def test_no_unit(self):
        self.change("mass = 900 kg", "mass = 900")

    def test_unit_that_does_not_fit(self):
        self.change("mass = 900 kg", "mass = 900 mm")

    def test_not_a_number(self):
        self.change("radius = 300 mm", "radius = wide mm")

    def test_infinite(self):
        self.change("radius = 300 mm", "radius = inf mm")

    def test_negative_radius(self):
        self.change("radius = 300 mm", "radius = -300 mm")

    def test_no_sense(self):
        self.sheet(GOOD.replace("angles = against rotation\n", ""), None)

    def test_no_phase(self):
        self.sheet(GOOD.replace("phase = lag\n", ""), None)

    def test_unknown_sense(self):
        self.change("angles = against rotation", "angles = clockwise")

    def test_no_such_plane(self):
        self.change("weight wheel = 40 g", "weight disc = 40 g")

    def test_no_such_position(self):
        self.change("at 30 deg", "at position 13")

    def test_no_such_sensor(self):
        self.change("reading DE = 6", "reading NDE = 6")

    def test_key_without_section(self):
        self.sheet("title = x\n" + GOOD, None, [1])

    def test_no_equal_sign(self):
        self.change("mass = 900 kg", "mass 900 kg")

    def test_all_errors_at_once(self):
        text = (GOOD.replace("mass = 900 kg", "mass = 900 mm").replace("radius = 300 mm", "radius = 300 V")
                .replace("weight wheel", "weight disc").replace("show = mm/s rms", "show = furlongs"))
        self.sheet(text, 4, [7, 12, 15, 24])

    def test_control_characters_never_reach_the_terminal(self):
        with chain.folder() as where:
            (where / "job.ini").write_text(GOOD.replace("mass = 900 kg", "ma\x1b[31mss = 900 kg"))
            done = chain.lopside("balance", where / "job.ini")
            self.assertEqual(done.returncode, 2)
            self.assertNotIn(b"\x1b", done.stderr)
            self.assertIn(b"job.ini:7:", done.stderr)


class BadUse(unittest.TestCase):
    def misuse(self, *args, stdin=b""):
        done = chain.lopside(*args, stdin=stdin)
        self.assertEqual((done.returncode, done.stdout), (2, b""), args)
        self.assertTrue(done.stderr)

    def test_command_line(self):
        self.misuse()
        self.misuse("balanse")
        self.misuse("balance")
        self.misuse("track", "--no-such-option")
        self.misuse("report", "--as", "pdf")
        self.misuse("read", "--run", "no such run", chain.DATA / "fan" / "job.ini")

    def test_not_a_stream(self):
        for stage in [*chain.STAGES[1:], "report"]:
            for junk in (b"hello\n", b"{}\n", b'{"kind":"job","lopside":999}\n{"kind":"end","records":1}\n',
                         b'{"kind":"job","kind":"job","lopside":1}\n', bytes(range(256)) * 40 + b"\n"):
                done = chain.lopside(stage, stdin=junk)
                self.assertIn(done.returncode, (1, 2), (stage, junk[:40]))
                self.assertEqual(len(chain.complaint(done).splitlines()), 1, (stage, junk[:40], done.stderr))
                self.assertNotIn(b"placement", done.stdout)


if __name__ == "__main__":
    unittest.main()
