"""The page and its pictures: weights drawn where they belong, nothing of the input run as markup.

Where a weight is drawn comes from the coordinates of the picture alone. Seen from the side the sheet
names, with the mark on top, an angle against rotation runs counter-clockwise where the rotor turns
clockwise: by the meaning of the words.
"""
import cmath
import csv
import html.parser
import io
import json
import math
import re
import unittest
import wave
import xml.etree.ElementTree as ElementTree

import chain

SVG = "{http://www.w3.org/2000/svg}"


def solved(rotation=None, angles=None, title=None, job="fan"):
    """The demo's stream, with some of its job record changed."""
    data = chain.through(chain.STAGES, b"", read=[chain.DATA / job / "job.ini"])
    lines = data.decode().splitlines()
    record = json.loads(lines[0])
    record["rotor"]["rotation"] = rotation
    record["angles"] = angles or record["angles"]
    record["title"] = title or record["title"]
    lines[0] = json.dumps(record, separators=(",", ":"), ensure_ascii=False)
    return "\n".join(lines + [""]).encode()


def drawn(picture):
    """{position: degrees clockwise from the top} of the placements in each plane's picture."""
    planes = []
    for svg in ElementTree.fromstring(picture).iter(SVG + "svg"):
        groups = {}
        for group in svg.findall(SVG + "g"):
            groups.setdefault(group.get("data-what"), []).append(group)
        if "disc" not in groups:
            continue
        disc = groups["disc"][0].find(SVG + "circle")
        x, y = float(disc.get("cx")), float(disc.get("cy"))
        places = {}
        for group in groups.get("placement", []):
            spot = group.find(SVG + "circle")
            dx, dy = float(spot.get("cx")) - x, float(spot.get("cy")) - y
            places[int(group.get("data-position"))] = math.degrees(math.atan2(dx, -dy)) % 360
        planes.append((places, groups))
    return planes


def written(*arguments):
    """The report of a job with a slow roll. Right triangles of sides 3, 4, 5: probe P reads 50 um at a lag of atan(40/30) as
    found and 36.0555 um at -atan(20/30) with the trial, and 30 um at 0 of them are runout: 40 um at 90 deg and
    20 um at 270 deg are left."""
    with chain.folder() as where:
        (where / "job.ini").write_text("""[job]
angles = against rotation
phase = lag
[rotor]
service speed = 1500 rpm
[sensor P]
unit = um
show = um pk-pk
[sensor V]
unit = mm/s
show = mm/s rms
[plane wheel]
radius = 200 mm
[run turned slowly]
role = runout
speed = 250 rpm
reading P = 30 um pk-pk at 0 deg
reading V = 0.1 mm/s rms at 10 deg
[run f]
speed = 1500 rpm
reading P = 50 um pk-pk at 53.130102 deg
reading V = 4 mm/s rms at 30 deg
[run t]
speed = 1500 rpm
weight wheel = 30 g at 0 deg
reading P = 36.055513 um pk-pk at 326.309932 deg
reading V = 4 mm/s rms at 150 deg
[aim]
repeatability = 1 %
""")
        done = chain.lopside("balance", *arguments, where / "job.ini")
        if done.returncode != 0:
            raise AssertionError(chain.complaint(done))
        return done.stdout.decode()


class Tags(html.parser.HTMLParser):
    def __init__(self, text):
        super().__init__()
        self.tags, self.words, self.attributes = set(), [], set()
        self.feed(text)

    def handle_starttag(self, tag, attrs):
        self.tags.add(tag)
        self.attributes.update(name for name, _ in attrs)

    def handle_data(self, data):
        self.words.append(data)


class Page(unittest.TestCase):
    def picture(self, stream):
        done = chain.lopside("report", "--as", "svg", "--what", "plane", stdin=stream)
        self.assertEqual(done.returncode, 0, chain.complaint(done))
        return done.stdout

    def test_weights_are_drawn_where_they_belong(self):
        for job in ("fan", "blower"):
            for rotation, way in (("clockwise", -1), ("counter-clockwise", 1), (None, -1)):
                for angles in ("against rotation", "with rotation"):
                    stream = solved(rotation, angles, job=job)
                    planes = drawn(self.picture(stream))
                    placements = chain.kind(chain.records(stream), "placement")
                    self.assertEqual(sum(len(p) for p, _ in planes), len(placements))
                    names = [p["name"] for p in chain.records(stream)[0]["planes"]]
                    for p in placements:
                        there = planes[names.index(p["plane"])][0][p["position"]]
                        self.assertLess(abs(chain.turn(there, way * p["angle_deg"])), 0.1)
                    for _, groups in planes:
                        self.assertEqual("rotation" in groups, rotation is not None)

    def test_missing_rotation_is_said(self):
        open_, told = self.picture(solved(None)), self.picture(solved("clockwise"))
        self.assertIn(b"MIRROR IMAGE", open_)
        self.assertNotIn(b"MIRROR IMAGE", told)
        self.assertIn(b"angles against rotation: counter-clockwise in this drawing", told)
        self.assertNotIn(b"clockwise", open_)  # neither the rotation nor the way of the angles
        self.assertIn(b"angles are counted from the mark, against rotation", open_)

    def test_drawn_mass_is_the_one_of_the_table(self):
        """Where any mass may be cut it has the digits that it deserves, in the drawing as in words."""
        mass = re.search(r"fit ([\d.]+ g) in one piece", written())[1]
        self.assertIn(f">{mass}</text>", written("--as", "svg", "--what", "plane"))

    def test_arrow_turns_as_the_rotor(self):
        for rotation, way in (("clockwise", 1), ("counter-clockwise", -1)):
            (_, groups), = drawn(self.picture(solved(rotation)))
            path = groups["rotation"][0].find(SVG + "path").get("d").replace("M", "").split("L")
            first, last = float(path[0].split()[0]), float(path[-1].split()[0])
            self.assertGreater(way * (last - first), 50)  # over the top: clockwise is to the right

    def test_text_has_the_placement_in_the_sheets_sense(self):
        for angles in ("against rotation", "with rotation"):
            done = chain.lopside("report", "--as", "html", stdin=solved("clockwise", angles))
            words = " ".join(Tags(done.stdout.decode()).words)
            for p in chain.kind(chain.records(solved("clockwise", angles)), "placement"):
                degrees = p["angle_deg"] if angles.startswith("against") else -p["angle_deg"] % 360
                self.assertIn(f"{degrees:.0f} deg {angles}", words)
                self.assertIn(f"fit {1000 * p['mass']:.0f} g", words)

    def test_nothing_is_run(self):
        evil = "</title><script>x</script>\"' onload=x <img src=x> \u00fc\u6f22"
        stream = solved("clockwise", title=evil).replace(b'"DE-V"', b'"<b onclick=1>\\"\'&"')
        done = chain.lopside("report", "--as", "html", stdin=stream)
        self.assertEqual(done.returncode, 0, chain.complaint(done))
        page = Tags(done.stdout.decode())
        self.assertFalse(page.tags & {"script", "img", "b"})
        self.assertFalse({a for a in page.attributes if a.startswith("on")})
        self.assertIn("\u00fc\u6f22", " ".join(page.words))
        self.assertNotIn(b"http", done.stdout.replace(b"http://www.w3.org/2000/svg", b""))
        for what in ("polar", "plane", "time", "spectrum", "speed"):
            done = chain.lopside("report", "--as", "svg", "--what", what, stdin=stream)
            found = {e.tag for e in ElementTree.fromstring(done.stdout).iter()}
            self.assertFalse(found & {SVG + t for t in ("script", "img", "b")})

    def test_slow_roll(self):
        for text in (written(), " ".join(Tags(written("--as", "html")).words)):
            text = " ".join(text.split())
            self.assertIn("Run 'turned slowly', slow roll (runout): no weights; 250 rpm", text)
            self.assertIn("displacement probes (P),", text)
            self.assertIn("No effect on V:", text)
            self.assertIn("Without runout: P 40 um pk-pk at 90 deg lag.", text)
            self.assertIn("Without runout: P 20 um pk-pk at 270 deg lag.", text)
            self.assertIn("before and after are without runout", text)
            self.assertRegex(text, r"P 30 um pk-pk - 0 deg - by hand taken off")
            self.assertRegex(text, r"V 0.1 mm/s rms - 10 deg - by hand no effect")
            self.assertEqual(text.count("slow roll (runout)"), 1)
        rows = list(csv.DictReader(io.StringIO(written("--as", "csv"), newline="")))
        self.assertEqual([r["role"] for r in rows], ["runout", "runout", "", "", "", ""])
        self.assertEqual([r["used"] for r in rows], ["yes", "no", "yes", "yes", "yes", "yes"])
        left = [(r["1x amplitude without runout (unit)"], r["lag without runout (deg)"]) for r in rows]
        self.assertEqual([bool(a or b) for a, b in left], [False, False, True, False, True, False])
        for row, amplitude, lag in ((2, 40, 90), (4, 20, 270)):
            self.assertAlmostEqual(float(left[row][0]), amplitude, 3)
            self.assertAlmostEqual(float(left[row][1]), lag, 3)

    def test_slow_roll_is_drawn(self):
        """The dots of probe P are the vectors without runout, as the forecast is; V has no dot of the slow roll."""
        svg = ElementTree.fromstring(written("--as", "svg", "--what", "polar"))
        plots = {}
        for plot in svg.findall(SVG + "svg"):
            plots[plot.get("aria-label").split()[-1]] = {
                g.get("data-run"): g for g in plot.findall(SVG + "g") if g.get("data-what") == "reading"}
        self.assertEqual(set(plots["V"]), {"f", "t"})
        self.assertEqual(set(plots["P"]), {"turned slowly", "f", "t"})
        found = plots["P"]["f"].find(SVG + "circle")
        x, y = float(found.get("cx")), float(found.get("cy"))
        corners = [tuple(map(float, c.split())) for c in
                   plots["P"]["t"].find(SVG + "path").get("d").strip("MZ").split("L")]
        trial = [sum(c[k] for c in corners) / len(corners) for k in (0, 1)]
        # 90 and 270 deg: on one level, and the middle of the plot twice as far from one as from the other
        self.assertAlmostEqual(y, trial[1], 1)
        self.assertAlmostEqual((x + 2 * trial[0]) / 3, 215, 1)
        self.assertLess(x, trial[0])  # lag grows against rotation: counter-clockwise from the top
        self.assertIsNone(plots["P"]["turned slowly"].find(SVG + "circle"))

    def test_time_ends_with_the_recording(self):
        """The axis ends where the file does, by its frames and rate as Python's wave reads them."""
        stream = solved("clockwise")
        done = chain.lopside("report", "--as", "svg", "--what", "time", stdin=stream)
        for plot in ElementTree.fromstring(done.stdout).iter(SVG + "svg"):
            if not plot.get("aria-label"):
                continue
            run = plot.get("aria-label").split(",")[0]
            (path,) = [f["path"] for r in chain.kind(chain.records(stream), "run") if r["run"] == run for f in r["files"]]
            with wave.open(str(chain.DATA / "fan" / path)) as file:
                seconds = file.getnframes() / file.getframerate()
            texts = [t.text for t in plot.iter(SVG + "text")]
            self.assertAlmostEqual(float(texts[texts.index("time, s") + 1]), seconds, delta=0.051)

    def test_same_bytes(self):
        pages = {chain.lopside("report", "--as", "html", stdin=solved("clockwise")).stdout for _ in "12"}
        self.assertEqual(len(pages), 1)


def by_hand(runs, aim="minimise = total\n", rotor="grade = G2.5\n", plane="positions = 8 from 0 deg\nstock = 0.5 1 2 g\n", phase="lag"):
    """A sheet of one plane and two sensors. runs: {name: [weight value, ...]}. Readings come from z0 + a*w, the linear law:
    a invented, z0 such that Instruction.TRIM takes away all but 0.05 mm/s."""
    answer = sum(m * cmath.exp(1j * math.radians(deg)) for m, deg in Instruction.TRIM)
    laws = {}
    for name, amplitude, deg in (("V", 0.84, 284), ("H", 0.63, 14)):
        a = amplitude * cmath.exp(1j * math.radians(deg))
        laws[name] = (-a * answer + 0.05, a)
    text = ("[job]\ntitle = Pump\nangles = against rotation\nphase = {}\n[rotor]\nmass = 80 kg\nservice speed = 2950 rpm\n{}"
            "[sensor V]\nunit = mm/s\n[sensor H]\nunit = mm/s\n[plane hub]\nradius = 160 mm\n{}[aim]\n{}"
            ).format(phase, rotor, plane, aim)
    for name, weights in runs.items():
        text += "[run {}]\nspeed = 2950 rpm\n".format(name)
        w = 0
        for mass, angle in weights:
            text += "weight hub = {} g at {} deg\n".format(mass, angle)
            w += mass * cmath.exp(1j * math.radians(angle))
        for sensor, (z0, a) in laws.items():
            z = z0 + a * w
            deg = math.degrees(cmath.phase(z)) * (1 if phase == "lag" else -1)
            text += "reading {} = {:.2f} mm/s rms at {:.1f} deg\n".format(sensor, abs(z), deg % 360)
    return text


class Instruction(unittest.TestCase):
    """What is told to whoever stands at the machine, in text and page alike."""

    def told(self, sheet, form, code=0):
        with chain.folder() as where:
            (where / "job.ini").write_text(sheet)
            done = chain.lopside("balance", "--as", form, where / "job.ini")
            self.assertEqual(done.returncode, code, chain.complaint(done))
        text = done.stdout.decode()
        return " ".join((" ".join(Tags(text).words) if form == "html" else text).split())

    def both(self, sheet):
        return [self.told(sheet, form) for form in ("text", "html")]

    TRIAL, FIRST, TRIM = [(2.5, 0)], [(4, 180), (1, 225)], [(4, 180), (1, 225), (1, 270)]

    def test_all_that_comes_off_is_named(self):
        """A run's correction weights are no trial weights: each weight that a run lists is named, once."""
        for text in self.both(by_hand({"as-found": [], "trial": self.TRIAL, "again": self.TRIAL, "corrected": [(3, 180)]},
                                      "target = 0.5 mm/s rms\n")):
            start = text.index("Relative to the rotor as found: first take off all that the runs list")
            said = text[start:text.index(".", text.index("(run 'corrected')", start))]
            self.assertEqual(said.count(" g at "), 2)
            self.assertIn("2.5 g at 0 deg against rotation on plane 'hub' (run 'trial')", said)
            self.assertIn("3 g at 180 deg against rotation on plane 'hub' (run 'corrected')", said)

    def test_what_others_left_comes_off(self):
        """The weights of `mounted` stay; those of any other run may still be on the rotor."""
        for text in self.both(by_hand({"as-found": [], "trial": self.TRIAL, "second": [(2.5, 225)]},
                                      "mounted = trial\ntarget = 1 mm/s rms\n")):
            self.assertIn("which stay on: 2.5 g at 0 deg against rotation on plane 'hub'. Take off first whatever else of "
                          "the runs is on: 2.5 g at 225 deg against rotation on plane 'hub' (run 'second').", text)
            self.assertNotIn("already carries", text)

    def test_what_is_on_is_not_fitted_again(self):
        runs = {"as-found": [], "trial": self.TRIAL, "first": self.FIRST, "trim": self.TRIM}
        for text in self.both(by_hand(runs, "mounted = first\ntarget = 0.5 mm/s rms\n")):
            self.assertIn("Run 'trim' already carries all that this answer asks for and meets the aim: if its weights are "
                          "still on, fit NOTHING of what stands here, it would be doubled; write `mounted = trim` and ask "
                          "again.", text)
        runs["trim"] = self.FIRST + [(0.5, 90)]
        for text in self.both(by_hand(runs, "mounted = first\ntarget = 0.1 mm/s rms\n")):
            self.assertNotIn("already carries", text)
            self.assertNotIn("meets the aim", text)

    def test_a_wrong_sense_cannot_be_seen(self):
        said = "these runs cannot show a wrong counting sense"
        runs = {"as-found": [], "trial": self.TRIAL}
        for phase in ("lag", "lead"):
            for text in self.both(by_hand(runs, phase=phase)):
                self.assertEqual(text.count(said), 1)
                self.assertIn("`phase` ({}) or `angles` (against rotation)".format(phase), text)
                self.assertLess(text.index(said), text.lower().index("before fitting"))
        runs["second"] = [(2.5, 90)]
        for text in self.both(by_hand(runs)):
            self.assertNotIn(said, text)

    def test_tolerance_not_met_is_said_at_the_answer(self):
        """G0.4 of 80 kg at 2950 rpm is 0.4*80/308.9 kg mm: 103.6 g mm (ISO 21940-11); 1 g at 160 mm, which FIRST lacks, is 160."""
        runs = {"as-found": [], "trial": self.TRIAL, "trim": self.FIRST}
        for grade, there in (("G0.4", True), ("G40", False)):
            for text in self.both(by_hand(runs, "mounted = trim\ntarget = 2 mm/s rms\n", "grade = {}\n".format(grade))):
                self.assertIn("Nothing: no weight is to be fitted.", text)
                box = text[:text.lower().index("forecast: 1x")]
                self.assertEqual("Tolerance NOT MET on plane 'hub': " in box, there)
                self.assertEqual("103.6 permissible (ISO 21940-11 G0.4), whatever the vibration is." in box, there)

    def test_predicted_lag_is_known_in_both_or_none(self):
        """Of what is predicted for the corrected run so little is left that its lag tells nothing."""
        runs = {"as-found": [], "trial": self.TRIAL, "trim": self.TRIM}
        sheet = by_hand(runs, "mounted = trim\ntarget = 0.5 mm/s rms\n")
        text, page = self.told(sheet, "text"), self.told(sheet, "html")
        self.assertRegex(text, r"predicted from the runs before it: .* not known")
        part = page[page.index("Predicted against measured"):]
        self.assertEqual(part.count("lag not known"), text.split("predicted from the runs before it:")[1]
                         .split("Apart:")[0].count("not known"))

    def test_before_is_fitted(self):
        """Readings that contradict each other: the fitted figure is not what the sheet says."""
        sheet = by_hand({"as-found": [], "trial": self.TRIAL, "again": self.TRIAL})
        self.assertNotIn("Before is what all runs together say", self.told(sheet, "text"))
        sheet = by_hand({"as-found": [], "trial": self.TRIAL, "second": [(2.5, 90)]})
        first, rest = sheet.split("[run trial]")
        wrong = first.replace("reading V = 4.23", "reading V = 4.90") + "[run trial]" + rest
        self.assertNotEqual(wrong, sheet)
        for text in self.both(wrong):
            self.assertIn("Before is what all runs together say; the readings themselves differ from it: V read 4.90 mm/s rms",
                          text)

    def test_a_converted_target_is_said(self):
        said = "Targets given in another quantity and converted at 1x: V; `target` with the sensor's name"
        sheet = by_hand({"as-found": [], "trial": self.TRIAL}, "target = 1 mm/s rms\n")
        for text in self.both(sheet):
            self.assertNotIn("converted at 1x", text)
        for text in self.both(sheet.replace("[sensor V]\nunit = mm/s\n", "[sensor V]\nunit = mm/s\nshow = um pk-pk\n")):
            self.assertIn(said, text)

    DRILL = "work = remove\nhole = 10 mm\ndensity = 7850 kg/m3\ndepth = 12 mm\n"

    def test_removal_is_said_as_removal(self):
        """A hole of 10 mm takes 0.6165 g a mm (steel, 7850 kg/m3), so 1 g is 1.6 mm deep; a point of 118 deg is 3 mm high."""
        sheet = by_hand({"as-found": [], "trial": [(6, 0)]}, plane=self.DRILL)
        for text in self.both(sheet):
            self.assertNotRegex(text, r"-\d+(\.\d+)? g ")
            self.assertIn("remove", text)
            self.assertNotIn("Each fixing must hold", text)
            self.assertIn("Nothing is drilled or cut off where the rotor's strength", text)
            self.assertNotIn("drill's point", text)
        sheet = by_hand({"as-found": [], "trial": [(6, 0)], "cut": [(-4, 0), (-1, 45)]}, "mounted = cut\ntarget = 0.1 mm/s rms\n", plane=self.DRILL)
        for text in self.both(sheet):
            self.assertIn("In addition to what was removed in run 'cut': 4 g removed at 0 deg", text)
            self.assertIn("Take off first whatever else of the runs is on: 6 g at 0 deg", text)
            self.assertIn("that is less than a drill's point is high, about 3 mm", text)

    def test_what_is_drilled_cannot_be_left_on(self):
        runs = {"as-found": [], "trial": [(6, 0)], "cut": [(-m, (a + 180) % 360) for m, a in self.TRIM]}
        for text in self.both(by_hand(runs, "mounted = cut\ntarget = 1 mm/s rms\n", plane=self.DRILL)):
            self.assertIn("Run 'cut' meets the aim: remove nothing more.", text)
            self.assertNotIn("leave its weights on", text)

    def test_the_next_step_names_what_there_is(self):
        runs = {"as-found": [], "trial": self.TRIAL}
        for text in self.both(by_hand(runs)):
            self.assertIn("Take all off that the runs list, fit what is placed, then run again", text)
        with chain.folder() as where:  # as found alone, with the responses of the runs above
            (where / "job.ini").write_text(by_hand(runs))
            data = chain.through(chain.STAGES, b"", read=[where / "job.ini"])
            (where / "stored.jsonl").write_text("".join(
                line + "\n" for line in data.decode().splitlines() if '"kind":"response"' in line))
            (where / "job.ini").write_text(by_hand({"as-found": []}, "responses = stored.jsonl\n"))
            done = chain.lopside("balance", where / "job.ini")
            self.assertEqual(done.returncode, 0, chain.complaint(done))
            text = " ".join(done.stdout.decode().split())
            self.assertIn("no run lists a weight, so leave on all that was on it then.", text)
            self.assertIn("Leave all weights on that were on as found, fit what is placed, then run again", text)
            self.assertNotIn("ake all off", text)

    def test_holes_in_the_table(self):
        with chain.folder() as where:
            (where / "job.ini").write_text(by_hand({"as-found": [], "trial": [(6, 0)]}, plane=self.DRILL))
            data = chain.through(chain.STAGES, b"", read=[where / "job.ini"])
        done = chain.lopside("report", "--as", "csv", "--what", "placement", stdin=data)
        (row,) = csv.DictReader(io.StringIO(done.stdout.decode(), newline=""))
        self.assertEqual(row["hole (mm)"], "10")
        depths = [float(d) for d in row["depths (mm)"].split()]
        # pi/4 (10 mm)^2 7850 kg/m3
        self.assertAlmostEqual(sum(depths) * math.pi / 4 * 100 * 7.85e-3, -float(row["mass"]), 2)
        picture = chain.lopside("report", "--as", "svg", "--what", "plane", stdin=data).stdout.decode()
        self.assertRegex(picture, r">[\d.]+ g off<")
        self.assertNotRegex(picture, r">-[\d.]+ g")


if __name__ == "__main__":
    unittest.main()
