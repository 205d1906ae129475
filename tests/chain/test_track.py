"""test_track.py - vectors and speeds of `track` against SciPy, over recordings with the tachos of the field.

SciPy goes its own way: edges at the middle level by linear interpolation of an oversampled signal
(scipy.signal.resample_poly), the shaft angle as a cubic spline through them, and least squares of a constant and
ten harmonics over the whole record. Without a tacho it fits a sine (scipy.optimize.least_squares) to the record.
"""
import math
import unittest
import wave

import numpy
from scipy import interpolate, optimize, signal

import chain

RATE = 6400
VECTOR = 0.02 * numpy.exp(1j * math.radians(222))  # m/s peak, argument is lag

SHEET = """[job]
angles = against rotation
[rotor]
mass = 300 kg
service speed = 1480 rpm
[recording]
full scale = 10 V
{tacho}[sensor A]
channel = 1
unit = mm/s
scale = 100 mV/(mm/s)
show = mm/s rms
[plane w]
radius = 400 mm
[run r]
file = r.wav
"""
TACHO = "[tacho]\nchannel = 2\n"


def bump(u, at, width):
    a = (u - at + 0.5) % 1 - 0.5
    return numpy.where(numpy.abs(a) < width / 2, 0.5 + 0.5 * numpy.cos(2 * numpy.pi * a / width), 0)


SHAPES = {
    "pulse": lambda u: 3 * bump(u, 0.02, 0.08),
    "slow edges on an offset": lambda u: 6 + 0.5 * bump(u, 0.05, 0.2),
    "up and down": lambda u: 2 * bump(u, 0.03, 0.06) - 2 * bump(u, -0.03, 0.06),
}


def turns(t, wander):
    return 0.31 + 24.7 * t + wander * 24.7 / (2 * math.pi * 1.1) * (1 - numpy.cos(2 * math.pi * 1.1 * t))


def vibration(u, draw, noise):
    theta = 2 * math.pi * u
    x = abs(VECTOR) * numpy.cos(theta - numpy.angle(VECTOR)) + 0.008 * numpy.cos(2 * theta - 1)
    return x + 0.004 * numpy.cos(3 * theta) + noise * draw.standard_normal(u.size)


def write(where, columns, tacho):
    volts = numpy.stack(columns, 1)
    with wave.open(str(where / "r.wav"), "wb") as file:
        file.setnchannels(volts.shape[1])
        file.setsampwidth(3)
        file.setframerate(RATE)
        ints = numpy.round(volts / 10 * 2**23).astype("<i4").reshape(-1, 1).view("u1").reshape(-1, 4)[:, :3]
        file.writeframes(ints.tobytes())
    (where / "job.ini").write_text(SHEET.format(tacho=tacho))


def tracked(where, stages=("read", "track")):
    return chain.records(chain.through(list(stages), b"", read=[where / "job.ini"]))


def by_scipy(x, tacho):
    """The 1x vector of the record between the first and the last mark."""
    up = 8
    fine = signal.resample_poly(tacho - tacho[0], up, 1)
    level = (fine.max() + fine.min()) / 2
    k = numpy.flatnonzero((fine[:-1] < level) & (fine[1:] >= level))
    k = k[(k > 60) & (k < fine.size - 60)]
    k = k[fine[k + 60] - fine[k - 60] > 0.5 * (fine.max() - fine.min())]  # not where a signal at rest ripples
    marks = (k + (level - fine[k]) / (fine[k + 1] - fine[k])) / up / RATE
    angle = interpolate.CubicSpline(marks, numpy.arange(marks.size))
    t = numpy.arange(x.size) / RATE
    inside = (t >= marks[1]) & (t <= marks[-2])
    theta = 2 * math.pi * angle(t[inside])
    base = numpy.stack([numpy.ones(theta.size)] +
                       [f(n * theta) for n in range(1, 11) for f in (numpy.cos, numpy.sin)], 1)
    fit = numpy.linalg.lstsq(base, x[inside], rcond=None)[0]
    return complex(fit[1], fit[2]), 60 * (marks.size - 1) / (marks[-1] - marks[0])


class Track(unittest.TestCase):
    def test_tachos(self):
        t = numpy.arange(12 * RATE) / RATE
        for name, shape in SHAPES.items():
            for wander in (0, 0.02):
                with self.subTest(name, wander=wander), chain.folder() as where:
                    u = turns(t, wander)
                    x = vibration(u, numpy.random.default_rng(4), 0.002)
                    write(where, [x * 100, shape(u)], TACHO)
                    stream = tracked(where)
                    blocks = chain.kind(stream, "turns")
                    got = sum(chain.vector(b["vectors"]["A"]) * b["turns"] for b in blocks)
                    got /= sum(b["turns"] for b in blocks)
                    want, speed = by_scipy(x, shape(u))
                    # both see the same noise but for a turn at each end: 0.1 rms of 1x over 76000 samples is
                    # 0.05 %, of which a hundredth differs
                    self.assertLess(abs(got / want - 1), 0.001)
                    # and the truth: noise of 0.05 % and 0.03 deg
                    self.assertLess(abs(got / VECTOR - 1), 0.002)
                    (tacho,) = chain.kind(stream, "tacho")
                    self.assertAlmostEqual(tacho["speed_rpm"], speed, delta=0.5)
                    self.assertTrue(tacho["reference"])

    def test_no_tacho(self):
        t = numpy.arange(20 * RATE) / RATE
        with chain.folder() as where:
            x = vibration(turns(t, 0), numpy.random.default_rng(5), 0.004)
            write(where, [x * 100], "")
            stream = tracked(where, ("read", "track", "average"))

        def off(p):
            return p[0] * numpy.cos(2 * math.pi * p[2] * t) + p[1] * numpy.sin(2 * math.pi * p[2] * t) - x

        fit = optimize.least_squares(off, [0.01, 0.01, 24.7], x_scale=[0.01, 0.01, 0.001]).x
        (reading,) = chain.kind(stream, "reading")
        self.assertIsNone(reading["vector"])
        self.assertLess(abs(reading["amplitude"] / math.hypot(fit[0], fit[1]) - 1), 0.005)
        self.assertAlmostEqual(reading["speed_rpm"], 60 * fit[2], delta=0.5)
        (spectrum,) = chain.kind(stream, "spectrum")
        lines = dict(zip(spectrum["orders"], spectrum["amplitude"]))
        theta = 2 * math.pi * fit[2] * t
        for order in (1, 2, 3):
            base = numpy.stack([numpy.cos(order * theta), numpy.sin(order * theta)], 1)
            want = math.hypot(*numpy.linalg.lstsq(base, x, rcond=None)[0])
            self.assertAlmostEqual(lines[order] / want, 1, delta=0.02)  # noise of 0.01 % and the speed's error
        self.assertNotIn("lines", spectrum)  # what does not turn with the shaft is not known here
        hz, power = signal.welch(x, RATE, "hann", 4096, scaling="density", detrend="constant")
        band = (hz >= 10) & (hz <= 1000)
        self.assertAlmostEqual(reading["overall"]["rms"] / math.sqrt(numpy.trapz(power[band], hz[band])), 1, delta=0.01)
        for block in chain.kind(stream, "turns"):
            self.assertIsNone(block["vectors"]["A"])
        (tacho,) = chain.kind(stream, "tacho")
        self.assertEqual((tacho["marks"], tacho["reference"]), (0, False))
        (finding,) = chain.kind(stream, "finding")
        self.assertEqual((finding["stage"], finding["check"], finding["verdict"]),
                         ("track", "speed-from-spectrum", "ok"))

    def test_no_tacho_and_doubtful(self):
        t = numpy.arange(12 * RATE) / RATE
        with chain.folder() as where:
            x = vibration(turns(t, 0), numpy.random.default_rng(6), 0.001)
            write(where, [(x + 0.015 * numpy.cos(2 * math.pi * 37.3 * t)) * 100], "")
            stream = tracked(where)
        (finding,) = chain.kind(stream, "finding")
        self.assertEqual(finding["verdict"], "caution")
        self.assertAlmostEqual(finding["value"], 75, delta=3)
        self.assertIn("37.3 Hz", finding["text"])

    def test_weight_without_a_tacho(self):
        """As found and three trials, from recordings alone: Z = Z0 + A W, of which only sizes are seen."""
        t = numpy.arange(8 * RATE) / RATE
        draw = numpy.random.default_rng(8)
        found, response = chain.weight(6e-3, 200), chain.weight(0.08e-3, 77)  # m/s, m/s per g
        want = -found / response
        sheet = SHEET.format(tacho="").replace("[run r]\nfile = r.wav\n", "")
        with chain.folder() as where:
            for k, (mass, angle) in enumerate([(0, 0), (40, 0), (40, 120), (40, 240)]):
                z = found + response * chain.weight(mass, angle)
                theta = 2 * math.pi * 24.6 * (1 + 0.001 * k) * t + draw.uniform(0, 6)
                x = abs(z) * numpy.cos(theta) + 0.5e-3 * numpy.cos(2 * theta) + 0.3e-3 * draw.standard_normal(t.size)
                write(where, [x * 100], "")
                (where / "r.wav").rename(where / f"r{k}.wav")
                sheet += f"[run r{k}]\nfile = r{k}.wav\n" + (f"weight w = {mass} g at {angle} deg\n" if mass else "")
            (where / "job.ini").write_text(sheet)
            (correction,) = chain.kind(chain.solved(where / "job.ini"), "correction")
        got = chain.weight(1000 * correction["mass"], correction["angle_deg"])
        self.assertLess(abs(got - want), 0.03 * abs(want))  # the project's bar for simulated jobs

    def test_lines_of_others(self):
        """SciPy takes the shaft's orders off by least squares over its own angle and sees the rest through a flat top."""
        t = numpy.arange(30 * RATE) / RATE
        others = {33.4: 0.013, 100: 0.004, 11.3: 0.003}
        with chain.folder() as where:
            u = turns(t, 0)
            x = vibration(u, numpy.random.default_rng(9), 0.002)
            x += sum(a * numpy.cos(2 * math.pi * hz * t + hz) for hz, a in others.items())
            write(where, [x * 100, SHAPES["pulse"](u)], TACHO)
            stream = tracked(where, ("read", "track", "average", "vet"))
        (spectrum,) = chain.kind(stream, "spectrum")
        theta = 2 * math.pi * u
        base = numpy.stack([f(n * theta) for n in range(1, 4) for f in (numpy.cos, numpy.sin)], 1)
        rest = x - base @ numpy.linalg.lstsq(base, x, rcond=None)[0]
        hz, power = signal.periodogram(rest, RATE, "flattop", scaling="spectrum", detrend="constant")
        self.assertEqual(len(spectrum["lines"]), len(others))
        for f, amplitude in spectrum["lines"]:
            near = numpy.flatnonzero(abs(hz - f) < 0.3)
            best = near[numpy.argmax(power[near])]
            self.assertLess(abs(amplitude / math.sqrt(2 * power[best]) - 1), 0.03)
            want = min(others, key=lambda other: abs(other - f))
            self.assertLess(abs(f - want), 0.03)
        self.assertEqual(spectrum["lines"], sorted(spectrum["lines"], key=lambda line: -line[1]))
        # vet names the largest of them from the coarser lines, to a sixteenth of an order
        (neighbour,) = [f for f in chain.kind(stream, "finding") if f["check"] == "neighbour"]
        self.assertEqual(neighbour["verdict"], "caution")
        told = float(neighbour["text"].split("line at ")[1].split(" Hz")[0])
        self.assertLess(abs(told - spectrum["lines"][0][0]), 24.7 / 16)

    def test_equal_marks(self):
        """Speed and amplitudes, but no phase."""
        t = numpy.arange(10 * RATE) / RATE
        with chain.folder() as where:
            u = turns(t, 0.01)
            x = vibration(u, numpy.random.default_rng(7), 0.001)
            write(where, [x * 100, 3 * bump(4 * u % 1, 0.06, 0.24)], TACHO + "marks = 4\n")
            stream = tracked(where)
        (tacho,) = chain.kind(stream, "tacho")
        self.assertFalse(tacho["reference"])
        self.assertAlmostEqual(tacho["speed_rpm"], 60 * 24.7, delta=10)
        for block in chain.kind(stream, "turns"):
            self.assertIsNone(block["vectors"]["A"])
            self.assertAlmostEqual(block["amplitudes"]["A"] / abs(VECTOR), 1, delta=0.01)

    def test_dead_tacho(self):
        """Speed and amplitude from the spectrum, where the job has runs enough to do with them."""
        t = numpy.arange(10 * RATE) / RATE
        draw = numpy.random.default_rng(11)
        for name, dead in {"zero": 0 * t, "two steps": numpy.floor(2 * draw.random(t.size)) * 10 / 2**23}.items():
            for runs in (1, 4):
                with self.subTest(name, runs=runs), chain.folder() as where:
                    write(where, [vibration(turns(t, 0), draw, 0.001) * 100, dead], TACHO)
                    with open(where / "job.ini", "a") as sheet:
                        for k in range(1, runs):
                            sheet.write(f"[run r{k}]\nfile = r.wav\nweight w = 10 g at {120 * k} deg\n")
                    stream = tracked(where)
                    blocks = chain.kind(stream, "turns")
                    self.assertEqual(len(blocks) > 0, runs == 4)
                    self.assertEqual(len(chain.kind(stream, "finding")), 4 if runs == 4 else 0)
                    if runs == 4:
                        self.assertEqual({tacho["marks"] for tacho in chain.kind(stream, "tacho")}, {0})
                    for block in blocks:
                        self.assertIsNone(block["vectors"]["A"])
                        self.assertAlmostEqual(block["amplitudes"]["A"] / abs(VECTOR), 1, delta=0.02)
                        self.assertAlmostEqual(block["speed_rpm"], 60 * 24.7, delta=2)


if __name__ == "__main__":
    unittest.main()
