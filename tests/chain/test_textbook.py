"""test_textbook.py - textbook examples as sheets of hand readings, in both counting senses.

A reading and a weight counted the same way round give the same figures whichever way that is; mixing the two
must give the wrong answer that the mix implies: the sheet's statements are what decides.
"""
import cmath
import math
import unittest

import chain

SENSES = [("against rotation", "lag"), ("with rotation", "lead")]


def sheet(angles, phase, unit, planes, runs, aim=("repeatability = 0 %",)):
    """planes: names; runs: [(name, {sensor: (amplitude, phase)}, [(plane, mass with unit, angle)])]."""
    sensors = list(runs[0][1])
    lines = ["[job]", "title = Textbook example", f"angles = {angles}", f"phase = {phase}"]
    for s in sensors:
        lines += ["", f"[sensor {s}]", f"unit = {unit}", f"show = {unit} pk"]
    for p in planes:
        lines += ["", f"[plane {p}]", "radius = 100 mm"]
    for name, readings, weights in runs:
        lines += ["", f"[run {name}]", "speed = 1200 rpm"]
        lines += [f"reading {s} = {a:.12g} {unit} pk at {d % 360:.12g} deg" for s, (a, d) in readings.items()]
        lines += [f"weight {p} = {mass} at {d % 360:.12g} deg" for p, mass, d in weights]
    lines += ["", "[aim]", *aim]
    return "\n".join(lines) + "\n"


def answer(text, code=0):
    with chain.folder() as where:
        path = where / "job.ini"
        path.write_text(text)
        stream = chain.solved(path, code)
    return {c["plane"]: c for c in chain.kind(stream, "correction")}


# S. S. Rao, Mechanical Vibrations, ch. 9, two-plane balancing of a turbine rotor (values from memory,
# recomputed independently with NumPy)
TURBINE = [
    ("as-found", {"A": (8.5, 60), "B": (6.5, 205)}, []),
    ("left", {"A": (6.0, 125), "B": (4.5, 230)}, [("L", "10 g", 270)]),
    ("right", {"A": (6.0, 35), "B": (10.5, 160)}, [("R", "12 g", 180)])]
OUNCE = 0.45359237 / 16  # exact: international yard and pound, 1959


class Textbook(unittest.TestCase):
    def near(self, c, mass, deg, mass_off, deg_off):
        """The ideal weight and the least-squares weight beside it, both in the sheet's sense."""
        self.assertAlmostEqual(c["mass"], mass, delta=mass_off)
        self.assertAlmostEqual(chain.turn(c["sheet_deg"], deg), 0, delta=deg_off)
        against = -deg if c["sense"] == "with rotation" else deg
        self.assertAlmostEqual(c["least_squares"][0], mass, delta=mass_off)
        self.assertAlmostEqual(chain.turn(c["least_squares"][1], against), 0, delta=deg_off)

    def one_plane(self, unit, found, trial, mass, mass_deg, want, want_deg, mass_off, deg_off=0.01):
        for angles, phase in SENSES:
            runs = [("as-found", {"S": found}, []), ("trial", {"S": trial}, [("P", mass, mass_deg)])]
            got = answer(sheet(angles, phase, unit, ["P"], runs))
            self.assertEqual(got["P"]["sense"], angles)
            self.near(got["P"], want, want_deg, mass_off, deg_off)

    def test_fan_from_a_handbook(self):
        # R. B. McMillan, Rotating Machinery (Fairmont Press), ch. 5, figs 5-2 to 5-4: printed 79 deg with a
        # protractor (+-3 deg), the triangle itself gives 76.996 deg and 3.9378 oz
        self.one_plane("mil", (3.5, 60), (5.0, 120), "5 oz", 0, 3.9378 * OUNCE, 76.9961, 1e-4 * OUNCE)

    def test_flywheel(self):
        # S. S. Rao, Mechanical Vibrations, ch. 9, problem on an unbalanced flywheel (statement found; answer
        # recomputed, it nulls the vector)
        self.one_plane("mm", (0.165, -15), (0.225, 35), "50 g", 45, 0.047534, 128.26, 1e-6)

    def test_flywheel_in_us_units(self):
        # the same problem in the US edition (numbers from memory)
        self.one_plane("mil", (6.5, -15), (8.8, 35), "2 oz", 45, 1.9135 * OUNCE, 127.87, 1e-4 * OUNCE)

    def test_grinding_wheel(self):
        # S. S. Rao, Mechanical Vibrations, ch. 9, problem on a grinding wheel (statement found, no printed
        # answer; recomputed)
        self.one_plane("mm", (0.2, 40), (0.5, 150), "0.2 kg", -65, 0.066815, 346.7, 1e-6, 0.05)

    def test_turbine_in_both_senses(self):
        for angles, phase in SENSES:
            got = answer(sheet(angles, phase, "um", ["L", "R"], TURBINE))
            self.near(got["L"], 10.0561e-3, 325.55, 1e-7, 0.01)
            self.near(got["R"], 5.8774e-3, 68.26, 1e-7, 0.01)

    def test_lag_mistaken_for_lead(self):
        # the weight comes out mirrored about the trial: 2*trial - right angle, same size
        for angles, phase in [("against rotation", "lead"), ("with rotation", "lag")]:
            got = answer(sheet(angles, phase, "um", ["L", "R"], TURBINE))
            self.near(got["L"], 10.0561e-3, 214.45, 1e-7, 0.01)
            self.near(got["R"], 5.8774e-3, 291.74, 1e-7, 0.01)

    def test_trial_weight_that_stayed_on(self):
        # the same readings, but the left weight was on the rotor in the right run, too: another answer
        runs = [TURBINE[0], TURBINE[1], (*TURBINE[2][:2], [("L", "10 g", 270), ("R", "12 g", 180)])]
        for angles, phase in SENSES:
            got = answer(sheet(angles, phase, "um", ["L", "R"], runs))
            self.near(got["L"], 5.3869e-3, 314.02, 1e-7, 0.01)
            self.near(got["R"], 5.8774e-3, 68.26, 1e-7, 0.01)


# A constructed set: eight sensors, three planes (amplitude, angle); answers by least squares with NumPy and, for
# the largest sensor, bracketed by cutting planes of a linear programme.
H = [[(0.42, 35), (0.18, 80), (0.11, 210)], [(0.3, 60), (0.37, 20), (0.16, 300)],
     [(0.12, 140), (0.33, 345), (0.39, 40)], [(0.09, 250), (0.21, 110), (0.45, 15)],
     [(0.65, 120), (0.4, 150), (0.25, 260)], [(0.52, 100), (0.58, 95), (0.31, 10)],
     [(0.28, 200), (0.55, 70), (0.6, 110)], [(0.19, 310), (0.36, 175), (0.71, 90)]]
FOUND = [(31, 200), (24, 150), (28, 95), (35, 40), (52, 310), (47, 255), (60, 180), (44, 120)]
EXACT = [(4.19183, 270.3724), (3.450451, 6.2355), (2.358297, 148.9274), (9.10964, 138.6982), (7.825742, 357.7551),
         (2.703801, 100.6097), (3.003722, 200.1432), (14.671373, 208.9517)]


def three_planes(found, aim=()):
    """Trial runs that follow from H, one plane after another, written as a sheet."""
    def polar(z):
        return abs(z), math.degrees(cmath.phase(z)) % 360
    runs = [("as-found", {f"S{i + 1}": v for i, v in enumerate(found)}, [])]
    for p in range(3):
        trial = chain.weight(40, 30)
        z = [chain.weight(*v) + chain.weight(*H[i][p]) * trial for i, v in enumerate(found)]
        runs.append((f"trial {p + 1}", {f"S{i + 1}": polar(v) for i, v in enumerate(z)}, [(f"P{p + 1}", "40 g", 30)]))
    return sheet("against rotation", "lag", "um", ["P1", "P2", "P3"], runs, ("repeatability = 0 %", *aim))


class ManySensors(unittest.TestCase):
    def near(self, got, want, relative, deg):
        for p, (mass, angle) in enumerate(want):
            c = got[f"P{p + 1}"]
            self.assertAlmostEqual(c["mass"] * 1000 / mass, 1, delta=relative)
            self.assertAlmostEqual(chain.turn(c["angle_deg"], angle), 0, delta=deg)

    def test_least_squares(self):
        self.near(answer(three_planes(FOUND)), [(31.12991, 331.092), (61.59819, 331.161), (73.35355, 221.289)],
                  1e-6, 1e-3)

    def test_exact_answer_is_found(self):
        self.near(answer(three_planes(EXACT)), [(12, 40), (7, 200), (15, 310)], 1e-5, 1e-3)

    def test_smallest_largest_sensor(self):
        self.near(answer(three_planes(FOUND, ["minimise = worst"])),
                  [(24.2644, 336.656), (67.9784, 330.966), (67.5743, 225.042)], 1e-3, 0.05)


if __name__ == "__main__":
    unittest.main()
