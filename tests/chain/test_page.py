"""The page and its pictures: weights drawn where they belong, nothing of the input run as markup.

Where a weight is drawn comes from the coordinates of the picture alone. Seen from the side the sheet
names, with the mark on top, an angle against rotation runs counter-clockwise where the rotor turns
clockwise: by the meaning of the words.
"""
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


if __name__ == "__main__":
    unittest.main()
