"""test_unsteady.py - what `average` says of runs that were not steady, and of blocks without phase.

Recordings with a neighbour machine are simulated; the blocks of the other cases are written here.
"""
import json
import os
import random
import subprocess
import unittest

import chain


def machine(neighbour_hz, rpm=1500, seconds=40):
    """10 mm/s or so at 1x, and a line of 1 mm/s of another machine."""
    return {
        "seed": 3, "title": "Two fans on one frame", "angles": "against rotation",
        "rotor": {"turning": "clockwise", "start_deg": 5, "rpm": rpm},
        "tape": {"at_deg": 20, "width_deg": 14},
        "tacho": {"at_deg": 135, "low_v": 0.4, "high_v": 4.6, "noise_v": 0.02},
        "modes": [{"x_hz": 40.0, "y_hz": 46.5, "damping": 0.06, "mass_kg": 900, "planes": [1.0], "sensors": [1.0]}],
        "heavy": [{"plane": 0, "mass_g": 250, "radius_mm": 600, "body_deg": 301}],
        "sensors": [{"name": "V", "unit": "mm/s", "scale": "100 mV/(mm/s)", "v_per_unit": 0.1, "show": "mm/s rms",
                     "at_deg": 90, "white": 0.1, "lines": [[neighbour_hz, 1.0, 40]]}],
        "planes": [{"name": "wheel", "radius_mm": 600}],
        "runs": [{"name": "as-found"}],
        "recording": {"format": "wav", "bits": 24, "rate_hz": 2560, "seconds": seconds, "full_scale_v": 10},
        "sheet": {"recording": ["full scale = 10 V"]},
    }


def blocks(values, key="vectors", **tacho):
    """A stream of one run and one sensor: a block of a second at 1500 rpm for each value."""
    with chain.folder() as where:
        chain.simulate(machine(24, seconds=2), where)
        stream = chain.lopside("read", where / "job.ini").stdout
    job = stream[:stream.index(b"\n") + 1]
    lines = [{"kind": "run", "run": "as-found", "condition": "service", "weights": [], "files": [], "when": None}]
    for i, value in enumerate(values):
        turns = {"kind": "turns", "run": "as-found", "t_s": i + 0.5, "turns": 25, "speed_rpm": 1500,
                 "vectors": {"V": None}, "rest": {"V": 0.1}}
        turns[key] = {"V": [value.real, value.imag] if key == "vectors" else value}
        lines.append(turns)
    lines.append({"kind": "tacho", "run": "as-found", "marks": 25 * len(values), "missed": 0, "extra": 0,
                  "jitter_deg": 0.1, "speed_rpm": 1500, "reference": True, "pulses": True, "scatter_rpm": 1} | tacho)
    lines.append({"kind": "end", "records": len(lines) + 1})
    return job + "".join(json.dumps(line, separators=(",", ":")) + "\n" for line in lines).encode()


def reading(data):
    (r,) = chain.kind(chain.records(chain.through(["average"], data)), "reading")
    return r


class Unsteady(unittest.TestCase):
    def neighbour(self, hz):
        with chain.folder() as where:
            truth = chain.simulate(machine(hz), where)
            stream = chain.records(chain.through(["read", "track", "average"], b"", read=[where / "job.ini"]))
        (r,) = chain.kind(stream, "reading")
        return r, 1000 * truth["readings"]["as-found"]["V"]["amplitude"]

    def test_a_neighbour_above_and_below(self):
        for hz in (25.3, 24.75):
            r, amplitude = self.neighbour(hz)
            steady = r["steady"]
            self.assertAlmostEqual(steady["neighbour_hz"], hz, delta=0.01)
            self.assertAlmostEqual(steady["beat_s"], 1 / abs(hz - 25), delta=0.1)
            self.assertAlmostEqual(steady["beat_pct"], 100 * 1.0 / amplitude, delta=0.05 * 100 / amplitude)
            self.assertEqual((steady["step_pct"], steady["step_s"]), (0, None))

    def test_a_faster_beat_is_told_from_its_alias(self):
        """Blocks of a second show 1.3 Hz as 0.3 Hz; the order spectrum has a line that only 1.3 Hz explains."""
        for hz in (26.3, 22.7):
            r, _ = self.neighbour(hz)
            self.assertGreater(r["steady"]["beat_pct"], 1)
            self.assertAlmostEqual(r["steady"]["neighbour_hz"], hz, delta=0.02)

    def test_far_away_it_is_no_beat(self):
        r, _ = self.neighbour(31.5)
        self.assertLess(r["steady"]["beat_pct"], 1)

    def test_a_step(self):
        rng = random.Random(1)
        values = [complex(5 + rng.gauss(0, 0.05), rng.gauss(0, 0.05)) + (0.8j if i >= 12 else 0) for i in range(30)]
        steady = reading(blocks(values))["steady"]
        self.assertAlmostEqual(steady["step_pct"], 100 * 0.8 / 5, delta=2)
        self.assertAlmostEqual(steady["step_s"], 12, delta=0.01)
        self.assertEqual((steady["beat_pct"], steady["set_aside"]), (0, 0))

    def test_bursts_are_counted(self):
        rng = random.Random(2)
        values = [complex(5 + rng.gauss(0, 0.05), rng.gauss(0, 0.05)) + (3 if i in (7, 19) else 0) for i in range(30)]
        r = reading(blocks(values))
        self.assertEqual((r["steady"]["set_aside"], r["blocks"]), (2, 28))
        self.assertAlmostEqual(r["vector"][0], 5, delta=0.05)

    def test_blocks_without_phase(self):
        rng = random.Random(7)
        values = [2 + rng.gauss(0, 0.1) for _ in range(25)]
        r = reading(blocks(values, "amplitudes", marks=0, reference=False))
        self.assertIsNone(r["vector"])
        self.assertEqual(r["steady"]["set_aside"], 0)
        self.assertAlmostEqual(r["amplitude"], sum(values) / 25, delta=1e-12)
        # The variance of a mean of 25: 0.01/25, as the random numbers have it within 2*sqrt(2/24) or so.
        self.assertAlmostEqual(r["cov"][0], 0.01 / 25, delta=0.6 * 0.01 / 25)
        self.assertEqual(r["cov"][1], 0)
        self.assertEqual(r["blocks"], 25)
        self.assertIsNone(r["steady"]["phase_deg"])
        self.assertIsNone(r["steady"]["neighbour_hz"])
        self.assertAlmostEqual(r["steady"]["amplitude_pct"], 5, delta=2)

    def test_a_day_in_one_run(self):
        """86,400 blocks of a second become coarser ones: memory does not grow with the run."""
        rng = random.Random(4)
        values = [complex(5 + rng.gauss(0, 0.05), rng.gauss(0, 0.05)) for _ in range(86400)]
        data = blocks(values)
        with chain.folder() as where:
            (where / "day.jsonl").write_bytes(data)
            peak = [os.environ["PEAK"], where / "peak"] if "PEAK" in os.environ else []
            done = subprocess.run([*peak, chain.LOPSIDE, "average", where / "day.jsonl"], capture_output=True,
                                  timeout=300)
            if peak:
                self.assertLess(int((where / "peak").read_text().split()[-1]), 16 * 1024)  # KiB, half of a stage's bar
        self.assertEqual(done.returncode, 0)
        (r,) = chain.kind(chain.records(done.stdout), "reading")
        self.assertAlmostEqual(r["vector"][0], 5, delta=0.001)
        self.assertEqual(r["steady"]["turns"] + 25 * 16 * r["steady"]["set_aside"], 25 * 86400)


if __name__ == "__main__":
    unittest.main()
