"""test_jobs.py - twenty simulated jobs: what the geometry says against what the program says.

Bars: readings within 1 % and 1 deg, ideal weights within 3 % (common practice for a field balancing job).
"""
import unittest

import numpy

import chain
import jobs

FORMS = [("wav", 24), ("flac", 24), ("csv", 0), ("wav", 16), ("csv", 0), ("rf64", 24), ("csv", 0), ("wav", 0),
         ("flac", 16), ("wav", 32)]


def separability(truth):
    """Condition number of the true responses, rows and columns scaled to unit length (NumPy)."""
    planes = list(truth["responses"].values())
    matrix = numpy.array([[chain.vector(s["vector"]) for s in p.values()] for p in planes]).T
    matrix = matrix / numpy.linalg.norm(matrix, axis=1, keepdims=True)  # sensors measure different quantities
    return numpy.linalg.cond(matrix / numpy.linalg.norm(matrix, axis=0))


class Jobs(unittest.TestCase):
    def check_readings(self, stream, truth):
        readings = chain.kind(stream, "reading")
        self.assertEqual(len(readings), sum(len(s) for s in truth["readings"].values()))
        for r in readings:
            true = truth["readings"][r["run"]][r["sensor"]]
            z = chain.vector(r["vector"])
            where = f"{r['run']}, {r['sensor']}"
            self.assertLess(abs(abs(z) / true["amplitude"] - 1), 0.01, where)
            self.assertLess(abs(chain.turn(chain.lag(z), true["lag_deg"])), 1, where)

    def check_corrections(self, stream, truth, spec, mounted):
        self.assertLess(separability(truth), 10)
        corrections = chain.kind(stream, "correction")
        self.assertEqual([c["plane"] for c in corrections], list(truth["corrections"]))
        for number, c in enumerate(corrections):
            true = truth["corrections"][c["plane"]]
            want = chain.weight(true["mass"], true["sheet_deg"])
            if mounted:
                radius = spec["planes"][number]["radius_mm"]
                for w in spec["runs"][-1]["weights"]:
                    if w["plane"] == number:
                        mass = w["mass_g"] / 1000 * w.get("radius_mm", radius) / radius
                        want -= chain.weight(mass, w["angle_deg"])
            got = chain.weight(c["mass"], c["sheet_deg"])
            self.assertLess(abs(got - want), 0.03 * max(abs(want), true["mass"]), c["plane"])
            against = -c["sheet_deg"] if spec["angles"] == "with rotation" else c["sheet_deg"]
            self.assertAlmostEqual(chain.turn(c["angle_deg"], against), 0, places=9)
            self.assertEqual(c["sense"], spec["angles"])

    def job(self, number):
        form, bits = FORMS[number % len(FORMS)]
        sense = ["against rotation", "with rotation"][number // 2 % 2]
        mounted = number % 5 == 3
        spec = jobs.job(1000 + number, 1 + number % 2, form, sense, left_on=number % 4 != 2 or mounted,
                        mounted=mounted, bits=bits, turning=["clockwise", "counter-clockwise"][number // 4 % 2])
        with chain.folder() as where:
            truth = chain.simulate(spec, where)
            stream = chain.solved(where / "job.ini")
        self.check_readings(stream, truth)
        self.check_corrections(stream, truth, spec, mounted)
        self.assertTrue(chain.kind(stream, "placement"))
        self.assertTrue(chain.kind(stream, "forecast"))

    def test_turned_the_other_way_is_wrong(self):
        """The proof can fail: the same recordings under a sheet with the other sense give another answer."""
        spec = jobs.job(77, 1, "wav", "against rotation", left_on=False, turning="clockwise")
        spec["runs"][1]["weights"][0]["angle_deg"] = 75
        with chain.folder() as where:
            truth = chain.simulate(spec, where)
            sheet = where / "job.ini"
            sheet.write_text(sheet.read_text().replace("against rotation", "with rotation"))
            stream = chain.solved(sheet)
        (c,) = chain.kind(stream, "correction")
        true = truth["corrections"]["disc 1"]
        off = abs(chain.weight(c["mass"], c["sheet_deg"]) - chain.weight(true["mass"], true["sheet_deg"]))
        self.assertGreater(off, 0.3 * true["mass"])


for n in range(20):
    setattr(Jobs, f"test_job_{n + 1:02}", lambda self, n=n: self.job(n))

if __name__ == "__main__":
    unittest.main()
