"""test_demo.py - the demo recordings worked through again from the raw files with NumPy and SciPy.

Another way of doing it: marks at half height by linear interpolation, a cubic spline through them, one least
squares fit of harmonics over the whole run. Bars: 0.1 % and 0.1 deg.
"""
import filecmp
import json
import pathlib
import subprocess
import unittest

import numpy
import scipy.interpolate
import scipy.io.wavfile

import chain

STANDARD_GRAVITY = 9.80665  # CGPM 1901


def vectors(rate, tacho, columns):
    """1x vector of each column by the definition a*cos(theta - lag), theta from the rising edge."""
    level = (numpy.percentile(tacho, 1) + tacho.max()) / 2
    above = tacho > level
    at = numpy.flatnonzero(~above[:-1] & above[1:])
    marks = at + (level - tacho[at]) / (tacho[at + 1] - tacho[at])
    assert numpy.ptp(numpy.diff(marks)) < 0.2 * numpy.diff(marks).mean(), "a mark is missing"
    turned = scipy.interpolate.CubicSpline(marks, 2 * numpy.pi * numpy.arange(len(marks)))
    n = numpy.arange(int(numpy.ceil(marks[0])), int(numpy.floor(marks[-1])) + 1)
    theta = turned(n)
    orders = (0.5, 1, 2, 3, 4, 12)
    basis = numpy.column_stack([numpy.ones(len(n))] + [f(k * theta) for k in orders for f in (numpy.cos, numpy.sin)])
    fit = numpy.linalg.lstsq(basis, numpy.column_stack([c[n] for c in columns]), rcond=None)[0]
    return fit[3] + 1j * fit[4]


def fan(path):
    rate, x = scipy.io.wavfile.read(path)
    volts = x / 32768 * 10                         # 10 V at digital full scale
    scale = STANDARD_GRAVITY / 0.1                 # 100 mV/g
    return vectors(rate, volts[:, 2], [volts[:, 0] * scale, volts[:, 1] * scale])


def blower(path):
    rows = path.read_text().replace(",", ".").splitlines()[4:]
    x = numpy.array([[float(c) for c in row.split(";")] for row in rows])
    return vectors(2048, x[:, 2], [x[:, 0] / 1000, x[:, 1] / 1000])  # mm/s


class Demo(unittest.TestCase):
    def compare(self, job, work, files, sensors):
        stream = chain.solved(chain.DATA / job / "job.ini")
        truth = json.loads((chain.DATA / job / "truth.json").read_text())
        got = {(r["run"], r["sensor"]): chain.vector(r["vector"]) for r in chain.kind(stream, "reading")}
        reference = {}
        for run, name in files.items():
            for sensor, z in zip(sensors, work(chain.DATA / job / name)):
                reference[run, sensor] = z
        self.assertEqual(got.keys(), reference.keys())
        for key, z in reference.items():
            self.assertLess(abs(abs(got[key]) / abs(z) - 1), 0.001, key)
            self.assertLess(abs(chain.turn(chain.lag(got[key]), chain.lag(z))), 0.1, key)
            true = chain.vector(truth["readings"][key[0]][key[1]]["vector"])
            self.assertLess(abs(z - true), 0.012 * abs(true), key)  # the reference itself is right
        return stream, reference, truth

    def test_fan(self):
        files = {"as-found": "as-found.wav", "as-found again": "as-found-again.wav", "trial": "trial.wav"}
        stream, z, truth = self.compare("fan", fan, files, ["DE-V", "DE-H"])
        (c,) = chain.kind(stream, "correction")
        # The textbook's formula for each sensor alone, mean of both as-found runs; position 3 is 60 deg
        trial = chain.weight(0.070, 60)
        for s in ("DE-V", "DE-H"):
            found = (z["as-found", s] + z["as-found again", s]) / 2
            alone = -found * trial / (z["trial", s] - found)
            self.assertLess(abs(chain.weight(*c["least_squares"]) - alone), 0.05 * abs(alone))
        true = truth["corrections"]["wheel"]
        self.assertLess(abs(chain.weight(c["mass"], c["sheet_deg"]) - chain.weight(true["mass"], true["sheet_deg"])),
                        0.05 * true["mass"])

    def test_blower(self):
        files = {"as-found": "as-found.csv", "trial left": "trial-left.csv", "trial both": "trial-both.csv"}
        names = ["Left H", "Right H"]
        stream, z, truth = self.compare("blower", blower, files, names)
        # Positions 11 and 5 of 16 stand at 225 and 90 deg with rotation, which is 135 and 270 against it
        left, right = chain.weight(0.040, 135), chain.weight(0.040, 270)
        found, first, both = (numpy.array([z[run, s] for s in names]) for run in files)
        response = numpy.column_stack([(first - found) / left, (both - first) / right])
        want = numpy.linalg.solve(response, -found)
        for c, w in zip(chain.kind(stream, "correction"), want):
            got = chain.weight(*c["least_squares"])
            self.assertLess(abs(abs(got) / abs(w) - 1), 0.002)  # twice the bar: two differences of readings
            self.assertLess(abs(chain.turn(chain.lag(got), chain.lag(w))), 0.2)
            true = truth["corrections"][c["plane"]]
            off = abs(chain.weight(c["mass"], c["sheet_deg"]) - chain.weight(true["mass"], true["sheet_deg"]))
            self.assertLess(off, 0.06 * true["mass"])

    def test_both_end_with_a_placement_and_its_forecast(self):
        for job in ("fan", "blower"):
            stream = chain.solved(chain.DATA / job / "job.ini")
            self.assertTrue(chain.kind(stream, "placement"))
            for f in chain.kind(stream, "forecast"):
                self.assertLess(abs(chain.vector(f["after"])), 0.3 * abs(chain.vector(f["before"])))
                self.assertLess(f["after_95"][1], f["target"])

    def test_the_simulator_makes_the_same_bytes_again(self):
        script = pathlib.Path(__file__).resolve().parents[1] / "sim" / "demo.sh"
        with chain.folder() as where:
            subprocess.run([script, chain.SIMULATE, where], check=True, timeout=60)
            for job in ("fan", "fan-after", "blower"):
                names = sorted(p.name for p in (where / job).iterdir())
                self.assertEqual(names, sorted(p.name for p in (chain.DATA / job).iterdir()))
                self.assertEqual(filecmp.cmpfiles(where / job, chain.DATA / job, names, shallow=False)[0], names)

    def test_size(self):
        self.assertLess(sum(p.stat().st_size for p in chain.DATA.rglob("*") if p.is_file()), 4e6)


if __name__ == "__main__":
    unittest.main()
