"""The page as a browser shows and prints it: whole, without a complaint, its weights where they belong.

Angles are measured on what was drawn, in pixels about the disc's middle, and compared by the meaning of the words:
with the mark on top, an angle counted with rotation runs clockwise where the rotor turns clockwise.
"""
import math
import pathlib
import shutil
import unittest
import wave

import browser
import chain

SENSES = ("against rotation", "with rotation")
TURNINGS = ("clockwise", "counter-clockwise")
WIDTHS = {"desktop": 1280, "phone": 390}
AUDIT = """[job]
title = Audit of {count} short recordings
[recording]
full scale = 10 V
[rotor]
service speed = 985 rpm
[tacho]
channel = 3
[sensor DE-V]
channel = 1
unit = g
scale = 100 mV/g
show = mm/s rms
[sensor DE-H]
channel = 2
unit = g
scale = 100 mV/g
show = mm/s rms
"""


def sheet_of(demo, angles, rotation):
    """That demo's sheet, counted and turning another way: its numbers then mean another machine."""
    lines = (chain.DATA / demo / "job.ini").read_text().splitlines()
    changed = {"angles": angles, "rotation": rotation}
    lines = [f"{line.split()[0]} = {changed[line.split()[0]]}" if line.split()[:1] and line.split()[0] in changed
             else line for line in lines]
    return "\n".join(lines + [""])


def cut(source, target, first, count):
    """`count` frames of a recording from `first` on."""
    with wave.open(str(source)) as whole, wave.open(str(target), "wb") as part:
        part.setparams(whole.getparams())
        whole.setpos(first)
        part.writeframes(whole.readframes(count))


def clockwise(turning, sheet_deg, sense):
    """Degrees clockwise from the mark, as seen, of an angle counted in that sense."""
    same = (turning == "clockwise") == (sense == "with rotation")
    return sheet_deg % 360 if same else -sheet_deg % 360


def measured(middle, at):
    return math.degrees(math.atan2(at[0] - middle[0], middle[1] - at[1])) % 360


class InBrowser(unittest.TestCase):
    @classmethod
    def setUpClass(cls):
        cls.where = pathlib.Path(cls.enterClassContext(chain.folder()))
        cls.browser = cls.enterClassContext(browser.chromium())
        for demo in ("fan", "blower"):
            shutil.copytree(chain.DATA / demo, cls.where / demo)

    def page(self, name, stream, code=0):
        done = chain.lopside("report", "--as", "html", stdin=stream)
        self.assertEqual(done.returncode, code, chain.complaint(done))
        path = self.where / f"{name}.html"
        path.write_bytes(done.stdout)
        return path

    def solved(self, demo, angles, rotation):
        sheet = self.where / demo / "job.ini"
        sheet.write_text(sheet_of(demo, angles, rotation))
        return chain.through(chain.STAGES, b"", read=[sheet])

    def sound(self, path, expected):
        """Nothing is cut, too wide or complained of, on screens and on paper; the words are there."""
        for view, width in WIDTHS.items():
            with self.subTest(page=path.name, view=view):
                self.assertEqual(self.browser.open(path, width), [])
                content, window = self.browser.widths()
                self.assertTrue(width - 20 <= window <= width, window)  # less a bar to scroll with
                self.assertLessEqual(content, window)
                self.assertEqual(self.browser.script(browser.CUT), [])
                self.assertEqual(self.browser.script(browser.OVERLAID), [])
                self.assertEqual(self.browser.script(browser.HIDDEN), [])
                shown = self.browser.words()
                self.assertEqual([words for words in expected if words not in shown], [])
        for paper, (wide, high) in browser.PAPERS.items():
            with self.subTest(page=path.name, paper=paper):
                pages = browser.pdf_pages(self.browser.printed(paper))
                for width, height, words in pages:
                    self.assertLess(abs(width - 72 * wide) + abs(height - 72 * high), 2)
                    margin = 20  # points: what an office printer leaves blank at most, common practice
                    for left, top, right, bottom, word in words:
                        self.assertTrue(left > margin and right < width - margin and top > margin
                                        and bottom < height - margin, (word, left, top, right, bottom))
                text = " ".join(w[4] for _, _, words in pages for w in words)
                text = text.replace("&apos;", "'").replace("&quot;", '"').replace("&lt;", "<").replace("&gt;", ">")
                text = "".join(text.split())
                self.assertEqual([words for words in expected if "".join(words.split()) not in text], [])

    def expected(self, records):
        """What must be read of each placement: position, angle and sense, mass, pieces' masses."""
        lines = []
        for p in chain.kind(records, "placement"):
            lines.append(f"{p['sheet_deg']:.4g} deg {p['sense']}")
            lines.append(f"fit {1000 * p['mass']:.0f} g")
        self.assertTrue(lines)
        return lines

    def in_place(self, records):
        job, placements = records[0], chain.kind(records, "placement")
        turning = job["rotor"]["rotation"]
        drawn = self.browser.script(browser.DRAWN)
        self.assertEqual(len(drawn), len(job["planes"]))
        seen = 0
        for plane, picture in zip(job["planes"], drawn):
            self.assertIn(plane["name"], picture["label"])
            self.assertTrue(picture["turns"])
            self.assertLess(abs(chain.turn(measured(picture["disc"], picture["mark"]), 0)), 0.5)
            here = {p["position"]: p for p in placements if p["plane"] == plane["name"]}
            weights = {g["position"]: g for g in picture["groups"] if g["what"] == "placement"}
            self.assertEqual(set(weights), set(here))
            for number, group in weights.items():
                p = here[number]
                there = measured(picture["disc"], group["at"])
                self.assertLess(abs(chain.turn(there, clockwise(turning, p["sheet_deg"], p["sense"]))), 0.5)
                self.assertEqual(group["text"][0], f"{1000 * p['mass']:.0f} g")
                seen += 1
            free = [g for g in picture["groups"] if g["what"] == "position"]
            for group in free:  # numbered from 1, from 0 deg, evenly, in the sheet's sense
                angle = (group["position"] - 1) * 360 / len(free)
                to = clockwise(turning, angle, job["angles"])
                self.assertLess(abs(chain.turn(measured(picture["disc"], group["at"]), to)), 0.5)
                self.assertEqual(group["text"], [str(group["position"])])
                self.assertLess(abs(chain.turn(measured(picture["disc"], group["name"]), to)), 8)
        self.assertEqual(seen, len(placements))

    def test_demo_jobs(self):
        for demo in ("fan", "blower"):
            stream = chain.through(chain.STAGES, b"", read=[chain.DATA / demo / "job.ini"])
            records = chain.records(stream)
            self.sound(self.page(demo, stream), self.expected(records))

    def test_weights_in_both_senses_of_counting_and_turning(self):
        for demo in ("fan", "blower"):
            for angles in SENSES:
                for rotation in TURNINGS:
                    with self.subTest(demo=demo, angles=angles, rotation=rotation):
                        stream = self.solved(demo, angles, rotation)
                        records = chain.records(stream)
                        self.assertEqual(self.browser.open(self.page("turned", stream), 1280), [])
                        self.in_place(records)
                        shown = self.browser.words()
                        self.assertEqual([words for words in self.expected(records) if words not in shown], [])

    def test_trim(self):
        stream = chain.through(chain.STAGES, b"", read=[chain.DATA / "fan-after" / "job.ini"])
        self.sound(self.page("after", stream), ["leave its weights on"])

    def test_audit_of_60(self):
        folder = self.where / "audit"
        folder.mkdir()
        (folder / "audit.ini").write_text(AUDIT.format(count=60))
        paths = []
        for k in range(60):
            name = f"K\u00fchlwasserpumpe {k:02} \u0394\u03a9" if k % 10 == 3 else f"machine-{k:02}"
            paths.append(folder / f"{name}.wav")
            source = ("as-found", "as-found-again", "trial")[k % 3]
            cut(chain.DATA / "fan" / f"{source}.wav", paths[-1], 700 * k, 2560 * (1 if k % 7 == 2 else 6))
        read = chain.lopside("read", folder / "audit.ini", *paths)
        self.assertEqual(read.returncode, 0, chain.complaint(read))
        stream = chain.through(["track", "average", "vet"], read.stdout)
        names = [p.stem for p in paths]
        self.sound(self.page("audit", stream), names)
        verdicts = self.browser.script("return document.querySelectorAll('.verdicts td:last-child').length")
        self.assertEqual(verdicts, 120)  # 60 recordings of two sensors; seen without scrolling, see `sound`
        many = self.browser.script("return [...document.querySelectorAll('svg')].map(s => s.ariaLabel)")
        for name in names:
            self.assertEqual(sum(name in label for label in many), 2)  # one a sensor

    def test_refused(self):
        sheet = self.where / "fan" / "refused.ini"
        text = (chain.DATA / "fan" / "job.ini").read_text()
        sheet.write_text(text.replace("file = trial.wav", "file = as-found.wav"))
        averaged = chain.through(["read", "track", "average"], b"", read=[sheet])
        vetted = chain.lopside("vet", stdin=averaged)
        self.assertEqual(vetted.returncode, 4, chain.complaint(vetted))
        stream = chain.lopside("solve", stdin=vetted.stdout).stdout
        self.sound(self.page("refused", stream, 4), ["Do not fit a correction weight", "same-recording"])
        self.assertEqual([g for d in self.browser.script(browser.DRAWN) for g in d["groups"]
                          if g["what"] == "placement"], [])


if __name__ == "__main__":
    unittest.main()
