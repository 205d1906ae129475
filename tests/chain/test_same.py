"""test_same.py - one answer, whichever way the chain is run; and none from half a stream.

By hand and by `balance`; runs read, tracked and averaged apart and put together; streams cut anywhere; a full
disk; a reader that goes away.
"""
import random
import subprocess
import unittest

import chain

SHEETS = {name: chain.DATA / name / "job.ini" for name in ("fan", "blower")}
ANSWERS = {"response", "correction", "placement", "forecast", "residual", "next", "finding", "reading", "vetted"}


class SameBytes(unittest.TestCase):
    def test_by_hand_and_balance(self):
        for name, sheet in SHEETS.items():
            stream = chain.through(chain.STAGES, b"", read=[sheet])
            for form in ("text", "csv", "json"):
                hand = chain.lopside("report", "--as", form, stdin=stream)
                balance = chain.lopside("balance", sheet, "--as", form)
                self.assertEqual((hand.returncode, balance.returncode), (0, 0), f"{name} as {form}")
                self.assertEqual(hand.stdout, balance.stdout, f"{name} as {form}")
                self.assertTrue(hand.stdout)
                self.assertEqual(balance.stderr, b"")

    def test_twice_the_same(self):
        first, second = (chain.through(chain.STAGES, b"", read=[SHEETS["blower"]]) for _ in range(2))
        self.assertEqual(first, second)

    def test_balance_into_a_file(self):
        with chain.folder() as where:
            done = chain.lopside("balance", SHEETS["fan"], "-o", where / "report.txt")
            self.assertEqual((done.returncode, done.stdout), (0, b""))
            self.assertEqual((where / "report.txt").read_bytes(), chain.lopside("balance", SHEETS["fan"]).stdout)
            self.assertEqual([p.name for p in where.iterdir()], ["report.txt"])

    def test_runs_apart(self):
        for name, sheet in SHEETS.items():
            whole = chain.through(chain.STAGES, b"", read=[sheet])
            runs = [r["run"] for r in chain.kind(chain.records(whole), "run")]
            self.assertGreater(len(runs), 1)
            parts = [chain.through(chain.STAGES[:3], b"", read=["--run", run, sheet]) for run in runs]
            for order in (parts, parts[::-1]):
                apart = chain.through(["vet", "solve"], b"".join(order))
                pick = [r for r in chain.records(apart) if r["kind"] in ANSWERS]
                want = [r for r in chain.records(whole) if r["kind"] in ANSWERS]
                self.assertEqual(sorted(map(str, pick)), sorted(map(str, want)), name)
                own = ("correction", "placement", "forecast", "next")
                self.assertEqual([r for r in pick if r["kind"] in own], [r for r in want if r["kind"] in own])
                text, other = (chain.lopside("report", stdin=s) for s in (apart, whole))
                self.assertEqual(text.stdout, other.stdout, name)

    def test_some_runs_twice_or_of_another_job(self):
        part = chain.through(chain.STAGES[:3], b"", read=["--run", "as-found", SHEETS["blower"]])
        other = chain.through(chain.STAGES[:3], b"", read=["--run", "as-found", SHEETS["fan"]])
        for mixed in (part + part, part + other):
            done = chain.lopside("vet", stdin=mixed)
            self.assertEqual(done.returncode, 2)
            self.assertEqual(len(chain.complaint(done).splitlines()), 1)


class HalfAStream(unittest.TestCase):
    def ends_early(self, stage, data, where):
        done = chain.lopside(stage, stdin=data)
        said = chain.complaint(done)
        self.assertEqual(done.returncode, 1, f"{stage} {where}: {said}")
        self.assertIn("ended early", said, f"{stage} {where}")
        self.assertEqual(len(said.splitlines()), 1, f"{stage} {where}")
        self.assertNotIn(b"placement", done.stdout, f"{stage} {where}")

    def cuts(self, data, many):
        draw = random.Random(5)
        ends = [i + 1 for i in range(len(data)) if data[i:i + 1] == b"\n"] if len(data) < 1 << 20 else []
        near = [e + d for e in draw.sample(ends, min(len(ends), many)) for d in (-1, 0, 1)]
        places = {0, 1, len(data) - 1, len(data) - 2, *near, *(draw.randrange(len(data)) for _ in range(many))}
        return sorted(p for p in places if p < len(data))

    def test_samples(self):
        data = chain.through(["read"], b"", read=["--run", "as-found", SHEETS["blower"]])
        for cut in self.cuts(data, 20):
            self.ends_early("track", data[:cut], f"cut at {cut} of {len(data)}")

    def test_records(self):
        data = chain.through(["read"], b"", read=[SHEETS["blower"]])
        for stage, following in zip(chain.STAGES[1:], [*chain.STAGES[2:], "report"]):
            data = chain.through([stage], data)
            for cut in self.cuts(data, 8):
                self.ends_early(following, data[:cut], f"cut at {cut} of {len(data)}")


class Output(unittest.TestCase):
    def test_full_disk(self):
        data = b""
        for stage in [*chain.STAGES, "report"]:
            args = [chain.LOPSIDE, stage] + ([SHEETS["fan"]] if stage == "read" else [])
            with open("/dev/full", "wb") as full:
                done = subprocess.run(args, input=data, stdout=full, stderr=subprocess.PIPE, timeout=60)
            self.assertEqual(done.returncode, 1, stage)
            self.assertEqual(len(done.stderr.splitlines()), 1, stage)
            data = chain.lopside(*args[1:], stdin=data).stdout

    def test_full_disk_under_balance(self):
        with open("/dev/full", "wb") as full:
            done = subprocess.run([chain.LOPSIDE, "balance", SHEETS["fan"]], stdout=full, stderr=subprocess.PIPE,
                                  timeout=60)
        self.assertEqual(done.returncode, 1)
        self.assertEqual(len(done.stderr.splitlines()), 1)

    def test_help_to_a_full_disk(self):
        for args in (["help"], ["--version"], ["track", "--help"]):
            with open("/dev/full", "wb") as full:
                done = subprocess.run([chain.LOPSIDE, *args], stdout=full, stderr=subprocess.PIPE, timeout=60)
            self.assertEqual(done.returncode, 1, args)

    def test_reader_goes_away(self):
        sheet = SHEETS["blower"]
        for left in (f"'{chain.LOPSIDE}' read '{sheet}'",
                     f"'{chain.LOPSIDE}' read '{sheet}' | '{chain.LOPSIDE}' track",
                     f"'{chain.LOPSIDE}' balance '{sheet}'"):
            done = subprocess.run(["bash", "-c", f"{left} | head -1"], capture_output=True, timeout=60)
            self.assertEqual(done.stderr, b"", left)
            self.assertEqual(done.stdout.count(b"\n"), 1, left)

    def test_samples_never_reach_a_terminal(self):
        done = subprocess.run(["script", "-qec", f"'{chain.LOPSIDE}' read '{SHEETS['fan']}'", "/dev/null"],
                              stdin=subprocess.DEVNULL, capture_output=True, timeout=60)
        self.assertEqual(done.returncode, 2)
        self.assertNotIn(b'"kind"', done.stdout)


if __name__ == "__main__":
    unittest.main()
