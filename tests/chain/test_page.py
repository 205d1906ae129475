"""The page and its pictures: weights drawn where they belong, nothing of the input run as markup.

Where a weight is drawn comes from the coordinates of the picture alone. Seen from the side the sheet
names, with the mark on top, an angle against rotation runs counter-clockwise where the rotor turns
clockwise: by the meaning of the words.
"""
import html.parser
import json
import math
import unittest
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
        self.assertIn(b"ASSUMED", self.picture(solved(None)))
        self.assertNotIn(b"ASSUMED", self.picture(solved("clockwise")))

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

    def test_same_bytes(self):
        pages = {chain.lopside("report", "--as", "html", stdin=solved("clockwise")).stdout for _ in "12"}
        self.assertEqual(len(pages), 1)


if __name__ == "__main__":
    unittest.main()
