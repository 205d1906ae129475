"""test_coast_down.py - from a recorded sweep through critical speeds to readings at listed speeds.

The recording is made by integrating the rotor's equations of motion through the sweep; what the readings are
compared with is its closed-form steady state at each speed (the simulator's truth of runs at these speeds).
The bar, 2 % and 2 deg at up to 20 rpm/s, is the project's own.
"""
import unittest

import chain

SPEEDS = [900, 1100, 1260, 1300.5, 1400]
SENSORS = ["V", "H"]


def machine(sweep, damping=0.06):
    """A rotor with critical speeds near 1260 and 1590 rpm; `sweep` in rpm per second from 1700 or 800 rpm."""
    start = 1700 if sweep < 0 else 800
    sensor = {"unit": "mm/s", "scale": "100 mV/(mm/s)", "v_per_unit": 0.1, "show": "mm/s rms", "white": 0.02}
    return {
        "seed": 11, "title": "Coast-down", "angles": "against rotation",
        "rotor": {"turning": "counter-clockwise", "start_deg": 5, "rpm": start},
        "tape": {"at_deg": 20, "width_deg": 14},
        "tacho": {"at_deg": 135, "low_v": 0.4, "high_v": 4.6, "noise_v": 0.02},
        "modes": [{"x_hz": 21.0, "y_hz": 26.5, "damping": damping, "mass_kg": 900, "planes": [1.0],
                   "sensors": [0.85, 0.8]}],
        "heavy": [{"plane": 0, "mass_g": 40, "radius_mm": 600, "body_deg": 301}],
        "sensors": [sensor | {"name": "V", "at_deg": 90}, sensor | {"name": "H", "at_deg": 0}],
        "planes": [{"name": "wheel", "radius_mm": 600}],
        "runs": [{"name": "coast", "rpm": start, "sweep_rpm_s": sweep, "seconds": 900 / abs(sweep),
                  "lines": ["role = coast-down",
                            "speeds = " + " ".join(map(str, SPEEDS)) + " 2400 rpm"]}] +
                [{"name": f"at {speed}", "rpm": speed, "seconds": 2} for speed in SPEEDS],
        "recording": {"format": "wav", "bits": 24, "rate_hz": 2560, "seconds": 2, "full_scale_v": 10,
                      "oversample": 2},
        "sheet": {"recording": ["full scale = 10 V"]},
    }


class CoastDown(unittest.TestCase):
    def averaged(self, sweep, **how):
        with chain.folder() as where:
            truth = chain.simulate(machine(sweep, **how), where)
            stream = chain.records(chain.through(["read", "track", "average"], b"",
                                                 read=["--run", "coast", where / "job.ini"]))
        true = truth["readings"]
        return stream, true

    def follows(self, sweep, **how):
        stream, true = self.averaged(sweep, **how)
        readings = chain.kind(stream, "reading")
        self.assertEqual([(r["condition"], r["sensor"]) for r in readings],
                         [(f"service @ {speed} rpm", s) for speed in SPEEDS for s in SENSORS])
        for r, speed in zip(readings, [speed for speed in SPEEDS for _ in SENSORS]):
            self.assertEqual(r["speed_rpm"], speed)
            ratio = chain.vector(r["vector"]) / chain.vector(true[f"at {speed}"][r["sensor"]]["vector"])
            self.assertLess(abs(abs(ratio) - 1), 0.02, r)
            self.assertLess(abs(chain.turn(chain.lag(ratio), 0)), 2, r)
            self.assertGreater(r["cov"][0], 0)
        return stream

    def test_down_slowly(self):
        self.follows(-10)

    def test_down_quickly(self):
        self.follows(-20)

    def test_up_quickly(self):
        self.follows(20)

    def test_a_sharp_resonance(self):
        """Crossed within three seconds, twice its half-power bandwidth of 63 rpm, by a rotor that rings for half of one."""
        self.follows(-20, damping=0.025)

    def test_a_job_of_coast_downs_only(self):
        """As found and with a trial weight, each a coast-down: every speed is a condition, the weight is shared."""
        spec = machine(-10)
        coast = spec["runs"][0]
        spec["runs"] = [coast, coast | {"name": "trial", "weights": [{"plane": 0, "mass_g": 60, "angle_deg": 30}]}]
        spec["planes"][0]["lines"] = ["positions = any"]
        with chain.folder() as where:
            truth = chain.simulate(spec, where)["corrections"]["wheel"]
            stream = chain.solved(where / "job.ini")
        (c,) = chain.kind(stream, "correction")
        self.assertLess(abs(chain.weight(c["mass"], c["angle_deg"]) - chain.weight(truth["mass"], truth["angle_deg"])),
                        0.02 * truth["mass"])
        vetted = [(v["run"], v["condition"], v["sensor"]) for v in chain.kind(stream, "vetted")]
        self.assertEqual(len(vetted), 2 * len(SPEEDS) * len(SENSORS))
        self.assertEqual(len(set(vetted)), len(vetted))

    def test_curve_and_what_was_not_recorded(self):
        stream, _ = self.averaged(-15)
        curves = chain.kind(stream, "curve")
        self.assertEqual([(c["run"], c["sensor"]) for c in curves], [("coast", s) for s in SENSORS])
        for curve in curves:
            self.assertEqual(len(curve["speed_rpm"]), len(curve["vector"]))
            self.assertGreaterEqual(len(curve["vector"]), 16)
            self.assertGreater(curve["speed_rpm"][0], curve["speed_rpm"][-1])
        (finding,) = chain.kind(stream, "finding")
        self.assertEqual((finding["stage"], finding["check"], finding["verdict"], finding["run"], finding["value"]),
                         ("average", "coast-down", "caution", "coast", 2400))
        self.assertRegex(finding["text"], r"^no reading at 2400 rpm: the run went from \d+ to \d+ rpm")


if __name__ == "__main__":
    unittest.main()
