"""test_memory.py - memory does not grow with the recording's length, and stays under 32 MiB a stage.

PEAK is a small program that starts the stage: Linux counts what a parent held as its child's peak.
"""
import os
import subprocess
import unittest
import wave

import chain
import jobs

LIMIT_KIB = 32 * 1024


def peak(args, source, target, note):
    """Runs a stage from file to file; gives its exit code and its peak resident memory in KiB."""
    with open(source, "rb") as data, open(target, "wb") as out:
        done = subprocess.run([os.environ["PEAK"], note, chain.LOPSIDE, *map(str, args)], stdin=data, stdout=out)
    return done.returncode, int(note.read_text().split()[-1])


def spec_of(form):
    spec = jobs.job(5, 1, form, "against rotation", left_on=False, bits=16, rate_hz=25600, seconds=4)
    # whole turns in 4 s, everything periodic in 4 s: the recording can be put end to end
    spec["rotor"] |= {"rpm": 1500, "wander": []}
    for run in spec["runs"]:
        run["rpm"] = 1500
    for s in spec["sensors"]:
        s["lines"] = [[60, s["white"], 0]]
    extra = dict(spec["sensors"][0], name="C-H")
    spec["sensors"].append(extra)
    for mode in spec["modes"]:
        mode["sensors"].append(0.7)
    rotor = spec["sheet"]["rotor"]
    rotor[1] = "service speed = 1500 rpm"
    if form == "csv":
        spec["recording"]["csv"] = {"separator": ";", "decimal": ",", "tacho_digits": 3}
        spec["sheet"]["recording"] = ["rate = 25600 Hz"]
    return spec


def lengthen(path, times):
    if path.suffix == ".wav":
        with wave.open(str(path)) as w:
            shape, data = w.getparams(), w.readframes(w.getnframes())
        with wave.open(str(path), "wb") as w:
            w.setparams(shape)
            for _ in range(times):
                w.writeframesraw(data)
        return
    head, _, rows = path.read_bytes().partition(b"\n")
    with path.open("wb") as out:
        out.write(head + b"\n")
        for _ in range(times):
            out.write(rows)


class Memory(unittest.TestCase):
    def stages(self, form, times):
        """Peak of every stage for recordings of 4 s * times."""
        peaks = {}
        with chain.folder() as where:
            chain.simulate(spec_of(form), where)
            for path in where.glob(f"*.{form}"):
                lengthen(path, times)
            source = os.devnull
            for stage in chain.STAGES:
                args = ["read", where / "job.ini"] if stage == "read" else [stage]
                target = where / f"after-{stage}"
                code, peaks[stage] = peak(args, source, target, where / "peaks")
                self.assertEqual(code, 0, stage)
                if source != os.devnull:
                    source.unlink()
                source = target
            code, peaks["report"] = peak(["report"], source, os.devnull, where / "peaks")
            self.assertEqual(code, 0)
        return peaks

    def compare(self, form, times):
        short, long = self.stages(form, times), self.stages(form, 2 * times)
        print(form, "KiB at", 4 * times, "s:", short, "and at", 8 * times, "s:", long)
        for stage, kib in long.items():
            self.assertLess(kib, LIMIT_KIB, stage)
            self.assertLess(kib - short[stage], 1024, stage)

    def test_wav(self):
        self.compare("wav", 15)

    def test_csv(self):
        self.compare("csv", 4)


if __name__ == "__main__":
    unittest.main()
