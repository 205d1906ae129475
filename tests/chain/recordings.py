"""recordings.py - recordings written sample by sample, each with one thing wrong with it, or nothing.

Two velocity pickups and a tacho on a machine at 1480 rpm. Only the contract of signs is used: a 1x vibration is
a cos(theta - lag), theta the angle turned since the mark's rising edge.
"""
import math
import wave

import numpy

RPM = 1480.0
RATE = 2560
FULL_SCALE_V = 10.0
VOLTS = 200.0  # per m/s: 200 mV/(mm/s)
SENSORS = ("A-H", "B-V")

SHEET = """[job]
title = An invented machine
angles = against rotation
[rotor]
mass = 340 kg
service speed = 1480 rpm
[recording]
full scale = 10 V
[tacho]
channel = 3
[sensor A-H]
channel = 1
unit = mm/s
scale = 200 mV/(mm/s)
[sensor B-V]
channel = 2
unit = mm/s
scale = 200 mV/(mm/s)
"""


class Machine:
    """What a recording is made of; every attribute has a harmless default."""

    def __init__(self, seed, **wrong):
        self.draw = numpy.random.default_rng(seed)
        self.seconds = 20.0
        self.rpm = RPM
        self.vectors = (6e-3 + 2e-3j, -3e-3 + 5e-3j)  # 1x, m/s peak, argument is lag
        self.white = 0.1        # rms of white noise, of the first sensor's 1x
        self.coloured = 0.02    # of slow noise (below 5 Hz)
        self.wander = 0.0       # standard deviation of speed, a sine of 6.3 s
        self.turning = 0.0      # lag in deg per % of speed
        self.two_x, self.half, self.line, self.far = 0.15, 0.03, 0.02, 0.05
        self.drift = self.step = 0.0  # of the vector, from start to end
        self.beat, self.beside = 0.0, 0.21  # a line beside 1x: size, and how many Hz above
        self.amplitude_scatter = self.lag_scatter = 0.0  # standard deviations, slow and irregular; deg
        self.rails = 0          # samples at full scale on the first channel
        self.first = None       # what becomes of the first channel: "constant", "toggles", "same"
        self.missing = 0.0      # share of tacho pulses that are gone
        self.tacho = True
        self.tape_deg = 0.0     # all lags grow by that: the mark comes earlier
        for name, value in wrong.items():
            if not hasattr(self, name):
                raise AttributeError(name)
            setattr(self, name, value)

    def slow(self, t, spread):
        """An irregular slow swing with that standard deviation, about 2 to 5 s long."""
        periods = [1.9, 2.7, 3.3, 4.9]
        total = sum(numpy.cos(2 * math.pi * (t / p + self.draw.random())) for p in periods)
        return spread * total / total.std() if spread else numpy.zeros_like(t)

    def channels(self):
        n = int(self.seconds * RATE)
        t = numpy.arange(n) / RATE
        percent = 100 * math.sqrt(2) * self.wander * numpy.sin(2 * math.pi * (t / 6.3 + self.draw.random()))
        f = self.rpm / 60 * (1 + percent / 100)
        theta = 2 * math.pi * (numpy.cumsum(f) / RATE + self.draw.random())
        size = abs(self.vectors[0])
        grow = 1 + self.slow(t, self.amplitude_scatter)
        lag = numpy.radians(self.slow(t, self.lag_scatter) + self.turning * percent)
        path = self.drift * (t / t[-1] - 0.5) + self.step * (t > 0.55 * self.seconds)
        out = []
        for z in self.vectors:
            moved = z * (grow + path) * numpy.exp(1j * lag)
            x = (moved * numpy.exp(-1j * theta)).real
            x += abs(z) * self.beat * numpy.cos(2 * math.pi * (self.rpm / 60 + self.beside) * t + self.draw.random())
            for order, share in ((2, self.two_x), (0.5, self.half)):
                x += abs(z) * share * numpy.cos(order * theta + 6 * self.draw.random())
            x += abs(z) * self.line * numpy.cos(2 * math.pi * 31.3 * t)
            x += abs(z) * self.far * numpy.cos(2 * math.pi * 91.7 * t)
            x += size * self.white * self.draw.standard_normal(n)
            out.append(x + self.noise(n, size * self.coloured))
        return out, self.pulses(theta + math.radians(self.tape_deg))

    def noise(self, n, rms):
        """Noise with all its power below about 5 Hz."""
        spectrum = numpy.fft.rfft(self.draw.standard_normal(n))
        spectrum /= 1 + 1j * numpy.fft.rfftfreq(n, 1 / RATE) / 5
        x = numpy.fft.irfft(spectrum, n)
        return rms * x / x.std()

    def pulses(self, theta):
        """A pulse of 25 deg a turn whose rising edge is at a whole turn."""
        if not self.tacho:
            return numpy.full(theta.size, 0.3) + 0.001 * self.draw.standard_normal(theta.size)
        turn, angle = numpy.divmod(theta, 2 * math.pi)
        edge = 2 * math.pi * self.rpm / 60 / RATE * 1.5  # 1.5 samples long
        angle = numpy.where(angle > math.pi, angle - 2 * math.pi, angle)
        level = numpy.clip(angle / edge + 0.5, 0, 1) * numpy.clip((math.radians(25) - angle) / edge + 0.5, 0, 1)
        # a pulse belongs to the whole turn that is nearest, so that none is cut in two
        gone = self.draw.random(int(turn[-1]) + 3) < self.missing
        level[gone[numpy.rint(theta / (2 * math.pi)).astype(int)]] = 0
        return 0.2 + 4.5 * level + 0.01 * self.draw.standard_normal(theta.size)

    def write(self, path):
        sensors, tacho = self.channels()
        if self.first == "constant":
            sensors[0][:] = 1e-3
        elif self.first == "toggles":
            sensors[0] = numpy.where(numpy.arange(tacho.size) % 7 < 3, 0, FULL_SCALE_V / VOLTS / 32768)
        elif self.first == "same":
            sensors[0] = sensors[1]
        volts = numpy.stack([sensors[0] * VOLTS, sensors[1] * VOLTS, tacho], axis=1)
        samples = numpy.clip(numpy.rint(volts / FULL_SCALE_V * 32768), -32767, 32766).astype("<i2")
        samples[1000:1000 + 100 * self.rails:100, 0] = 32767
        with wave.open(str(path), "wb") as out:
            out.setnchannels(3)
            out.setsampwidth(2)
            out.setframerate(RATE)
            out.writeframes(samples.tobytes())


def write(path, seed, **wrong):
    Machine(seed, **wrong).write(path)


def steady(path, seed):
    """A recording of nothing but a steady machine: sizes, lags, noise and length as they come."""
    draw = numpy.random.default_rng([seed, 7])
    size = 10 ** draw.uniform(-3, -1.7, 2)
    lags = draw.uniform(0, 2 * math.pi, 2)
    noisy = size.min() / size[0]  # noise is told against the first sensor
    write(path, seed, vectors=tuple(size * numpy.exp(1j * lags)), seconds=draw.uniform(12, 30),
          white=noisy * draw.uniform(0.02, 0.5), coloured=noisy * draw.uniform(0, 0.05), wander=draw.uniform(0, 0.003),
          two_x=draw.uniform(0, 0.3), half=draw.uniform(0, 0.2), line=draw.uniform(0, 0.2), far=draw.uniform(0, 0.3),
          rpm=RPM * (1 + draw.uniform(-0.01, 0.01)), turning=draw.uniform(-2, 2))


# check, what trips it, with which verdict, and what is just on the good side. The limits are those of the design's
# table, common practice.
DETECTION = [
    ("length", {"seconds": 3.5}, "caution", {"seconds": 4.4}),
    ("length", {"seconds": 0.75}, "refuse", {"seconds": 1.2}),
    ("service-speed", {"rpm": RPM * 1.025}, "caution", {"rpm": RPM * 1.015}),
    ("service-speed", {"rpm": RPM * 0.88}, "refuse", {"rpm": RPM * 0.92}),
    ("speed-steady", {"wander": 0.013}, "caution", {"wander": 0.008}),
    ("speed-steady", {"wander": 0.034}, "refuse", {"wander": 0.026}),
    ("amplitude-steady", {"amplitude_scatter": 0.14}, "caution", {"amplitude_scatter": 0.07}),
    ("amplitude-steady", {"amplitude_scatter": 0.40}, "refuse", {"amplitude_scatter": 0.25}),
    ("phase-steady", {"lag_scatter": 8}, "caution", {"lag_scatter": 4}),
    ("phase-steady", {"lag_scatter": 27}, "refuse", {"lag_scatter": 16}),
    ("drift", {"drift": 0.07}, "caution", {"drift": 0.035}),
    ("drift", {"drift": 0.25}, "refuse", {"drift": 0.16}),
    ("drift", {"step": 0.12}, "caution", {"step": 0.02}),
    ("beat", {"beat": 0.13}, "caution", {"beat": 0.07}),
    ("beat", {"beat": 0.48}, "refuse", {"beat": 0.32}),
    ("one-x-share", {"far": 1.9}, "caution", {"far": 1.5}),
    ("two-x", {"two_x": 0.54}, "caution", {"two_x": 0.46}),
    ("half-order", {"half": 0.54}, "caution", {"half": 0.46}),
    ("neighbour", {"line": 0.60}, "caution", {"line": 0.42}),
    ("clipping", {"rails": 1}, "caution", {"rails": 0}),
    ("clipping", {"rails": 10}, "refuse", {"rails": 9}),
    ("sensor-dead", {"first": "constant"}, "refuse", {}),
    ("sensor-dead", {"first": "toggles"}, "refuse", {}),
    ("sensor-dead", {"first": "same"}, "refuse", {}),
    ("tacho", {"missing": 0.025}, "caution", {"missing": 0.003}),
    ("tacho", {"missing": 0.32}, "refuse", {"missing": 0.18}),
    ("phase-reference", {"tacho": False}, "refuse", {}),
    ("near-resonance", {"wander": 0.003, "turning": 7.5}, "caution", {"wander": 0.003, "turning": 3}),
]
WORSE = {"ok": 0, "caution": 1, "refuse": 2}
