"""test_advice.py - what stays mounted, and the next step in words, over the real program.

Sheets of exact hand readings; expected values come from the truth that made them.
"""
import cmath
import json
import math
import re
import unittest

import chain
from test_correct import SENSES, findings, sheet, stream_of, trials


class Mounted(unittest.TestCase):
    """What stays on counts: at its position, on its plane, and in the force."""

    def placed(self, *lines, mounted=True, own=True):
        truth = {"A": [30 * cmath.exp(1j), 1000 * cmath.exp(2.5j)]}  # 30 g are needed, at 94 deg
        plane = {"P": ["radius = 500 mm", *(["positions = 12 from 0 deg"] if own else []), *([] if "pieces = 1" in lines else ["pieces = 2"]), *lines]}
        aim = ["repeatability = 0 %", *(["mounted = trial 1"] if mounted else [])]
        rotor = ["mass = 100 kg", "service speed = 1200 rpm"]
        return stream_of(sheet(plane, trials(truth, [("P", 0.015, 90)]), aim, rotor=rotor))

    def test_most_at_a_position(self):
        at_90 = lambda s: sum(p["mass"] for p in chain.kind(s, "placement") if p["position"] == 4)
        self.assertAlmostEqual(at_90(self.placed("stock = 5 10 g", "most = 25 g")), 0.010, delta=1e-9)
        self.assertEqual(at_90(self.placed("stock = 5 10 g", "most = 15 g")), 0)
        self.assertEqual(at_90(self.placed("most = 15 g")), 0)
        self.assertGreater(at_90(self.placed("stock = 5 10 g", "most = 15 g", mounted=False)), 0.009)

    def test_most_where_any_mass_may_stand(self):
        """At most 25 g a place, 15 g of them at 90 deg already: 10 g more fill it. The 15.1 g at 98 deg that are wanted would
        have 5.4 g left (cosine rule); 14 g at 120 deg, their projection, leave 15.1 sin 22 deg = 5.6 g."""
        (p,) = chain.kind(self.placed("most = 25 g", "pieces = 1"), "placement")
        self.assertEqual(p["position"], 4)
        self.assertAlmostEqual(p["mass"], 0.010, delta=1e-9)
        self.assertAlmostEqual(p["total_mass"], 0.025, delta=1e-9)
        for p in chain.kind(self.placed("positions = any", "most = 25 g", own=False), "placement"):
            near = abs(chain.turn(p["sheet_deg"], 90)) <= 0.5
            self.assertLessEqual(p["mass"], (0.010 if near else 0.025) + 1e-9)

    def test_most_on_a_plane(self):
        for own in (["stock = 5 10 g"], []):
            placed = chain.kind(self.placed("most in all = 20 g", *own), "placement")
            self.assertAlmostEqual(sum(p["mass"] for p in placed), 0.005, delta=1e-9)

    def test_total_and_force(self):
        stream = self.placed("stock = 5 10 g", "most = 25 g")
        (p,) = (p for p in chain.kind(stream, "placement") if p["position"] == 4)
        self.assertAlmostEqual(p["total_mass"], 0.025, delta=1e-9)
        omega = 0.5 * (1200 * math.pi / 30) ** 2  # r w^2
        self.assertAlmostEqual(p["total_force_n"], 0.025 * omega, delta=1e-3)
        pull = omega * abs(chain.weight(0.015, 90) + sum(chain.weight(q["mass"], q["sheet_deg"])
                                                          for q in chain.kind(stream, "placement")))
        (f,) = findings(stream, "correction-force")
        self.assertAlmostEqual(f["value"], 100 * pull / (50 * 9.80665), delta=1e-3)  # of half the weight
        (p,) = chain.kind(self.placed("stock = 5 10 g", mounted=False), "placement")[:1]
        self.assertNotIn("total_mass", p)


class Limits(unittest.TestCase):
    """[limits] over the checks of solve: one value is the caution limit, two are caution and refusal, `none` is off."""

    def verdict(self, check, text, *limits):
        with chain.folder() as where:
            (where / "job.ini").write_text(text + ("[limits]\n" + "\n".join(limits) + "\n" if limits else ""))
            done = chain.lopside("balance", where / "job.ini", "--as", "json")
        stream = json.loads(done.stdout)
        found = findings(stream, check)
        if any(f["verdict"] == "refuse" for f in found):
            self.assertIn(done.returncode, (4, 5), chain.complaint(done))
            self.assertEqual(chain.kind(stream, "placement"), [])
        else:
            self.assertEqual(done.returncode, 0, chain.complaint(done))
        self.assertLessEqual(len(found), 1)
        return (found[0]["verdict"], found[0]["limit"], found[0]["value"]) if found else (None, None, None)

    def jobs(self):
        """One job a check, each with a figure of its own between 1 and the caution limit or little above."""
        z, a = 30 * cmath.exp(1j), 1000 * cmath.exp(2.5j)
        runs = trials({"A": [z, a]}, [("P", 0.02, 30)])
        off = runs + [("second", {"A": complex(z + 0.8 + a * chain.weight(0.02, 150))}, [("P", 0.02, 150)])]
        yield "linearity", sheet({"P": []}, off, ["repeatability = 1 %"])
        turned = runs + [("second", {"A": complex(z + a * chain.weight(0.02, 153))}, [("P", 0.02, 150)])]
        yield "lag-follows-weight", sheet({"P": []}, turned, ["repeatability = 1 %"])
        rotor = ["mass = 200 kg", "service speed = 1200 rpm"]
        yield "correction-force", sheet({"P": []}, runs, ["repeatability = 0 %"], rotor=rotor)
        two = {"A": [z, a, 0.9 * a], "B": [20j, 700 + 0j, 800 * cmath.exp(0.2j)]}
        yield "conditioning", sheet({"P": [], "Q": []}, trials(two, [("P", 0.02, 0), ("Q", 0.02, 0)]))

    def test_limits(self):
        for check, text in self.jobs():
            with self.subTest(check):
                _, limit, value = self.verdict(check, text)
                self.assertEqual(limit, {"correction-force": 15, "conditioning": 10}.get(check, 3))  # as the table has it
                self.assertGreater(value, 0.5)
                unit = {"correction-force": " %", "conditioning": ""}.get(check, " s.e.")
                at = lambda *shares: f"{check} = " + " ".join(f"{s * value:.6g}{unit}" for s in shares)
                for shares, verdict, crossed in (((1.1,), "ok", 1.1), ((0.9,), "caution", 0.9), ((1.1, 1.2), "ok", 1.1),
                                                 ((0.9, 1.1), "caution", 0.9), ((0.8, 0.9), "refuse", 0.9)):
                    got, limit, _ = self.verdict(check, text, at(*shares))
                    self.assertEqual(got, verdict, shares)
                    self.assertAlmostEqual(limit / value, crossed, delta=1e-4)
                self.assertIsNone(self.verdict(check, text, f"{check} = none")[0])

    def test_a_caution_beyond_the_refusal(self):
        """Whoever asks for a caution at 200 is not refused at 100."""
        a = 1000 * cmath.exp(2.5j)
        two = {"A": [30 + 0j, a, a], "B": [20j, a, a * (1 + 0.02j)]}  # about 200
        text = sheet({"P": [], "Q": []}, trials(two, [("P", 0.02, 0), ("Q", 0.02, 0)]))
        got, limit, value = self.verdict("conditioning", text)
        self.assertEqual((got, limit), ("refuse", 100))
        self.assertEqual(self.verdict("conditioning", text, f"conditioning = {value + 1:g}")[0], "ok")


class Step(unittest.TestCase):
    """What the next step says, and that it promises no more than the runs show."""

    def step(self, text, code):
        with chain.folder() as where:
            (where / "job.ini").write_text(text)
            done = chain.lopside("balance", where / "job.ini", "--as", "json")
        self.assertEqual(done.returncode, code, chain.complaint(done))
        (step,) = chain.kind(json.loads(done.stdout), "next")
        return step

    def test_a_fit_that_is_visibly_wrong_promises_little(self):
        """A trial of 20 g that the sheet has as 13 g, 120 deg from another: what the machine then does is in the range."""
        z, a = 30 * cmath.exp(1j), 1000 * cmath.exp(2.5j)
        for kg, sure in ((0.020, True), (0.013, False)):
            runs = trials({"A": [z, a]}, [("P", 0.02, 30)])
            runs.append(("second", {"A": complex(z + a * chain.weight(0.02, 150))}, [("P", kg, 150)]))
            stream = stream_of(sheet({"P": []}, runs, ["repeatability = 1 %", "target = 10 um pk"]))
            (misfit,) = findings(stream, "linearity")
            self.assertEqual(misfit["verdict"], "ok" if sure else "caution")
            (f,) = chain.kind(stream, "forecast")
            after = abs(z + a * sum(chain.weight(p["mass"], p["sheet_deg"]) for p in chain.kind(stream, "placement")))
            self.assertLess(after, f["after_95"][1] * 1e6)
            self.assertEqual(f["chance"] > 0.99, sure)

    def test_good_as_found(self):
        """Within the target with room for scatter: nothing to fit, trial or not; close to it: go on as ever."""
        for z, step in ((7, "done"), (9.9, "trial"), (12, "trial")):
            truth = {"A": [z * cmath.exp(1j), 1000 * cmath.exp(2.5j)]}
            aim = ["repeatability = 3 %", "target = 10 um pk"]
            runs = trials(truth, [("P", 0.02, 30)])
            (alone,) = chain.kind(stream_of(sheet({"P": []}, runs[:1], aim)), "next")
            self.assertEqual(alone["step"], step)
            tried = stream_of(sheet({"P": []}, runs, aim))
            (after,) = chain.kind(tried, "next")
            self.assertEqual(after["step"], "done" if step == "done" else "correct")
            self.assertEqual(chain.kind(tried, "placement") == [], step == "done")

    def test_the_next_step_goes_by_the_cause(self):
        z, a = 30 * cmath.exp(1j), 1000 * cmath.exp(2.5j)
        rotor = ["mass = 200 kg", "service speed = 1200 rpm"]  # 10 % of half the weight at 100 mm: 62 g
        runs = trials({"A": [z, a]}, [("P", 0.0005, 30)])
        step = self.step(sheet({"P": []}, runs, ["repeatability = 3 %"], rotor=rotor), 4)
        self.assertIn("run 'trial 1': repeat with a larger trial weight, about 62 g (sensor 'A')", step["text"])
        # counted the wrong way round: that leads, and no single run is blamed though all would fit without the second
        runs = trials({"A": [z, a]}, [("P", 0.02, 30)])
        runs += [(n, {"A": complex(z + a * chain.weight(0.02, d))}, [("P", 0.02, 60 - d)])
                 for n, d in (("second", 120), ("third", 210))]
        step = self.step(sheet({"P": []}, runs, ["repeatability = 1 %"]), 4)
        self.assertRegex(step["text"], "^from run '.* deg (?:with|against) rotation .*counted the other way.*; the runs contradict each "
                                       "other at sensor 'A'")
        self.assertNotIn("any one", step["text"])

    def test_a_target_that_will_be_missed(self):
        """The only position is 60 deg off: 30 um sin 60 deg stay; of two sensors that want opposite weights half stays."""
        z, a = 30 * cmath.exp(1j), 1000 * cmath.exp(2.5j)
        want = math.degrees(cmath.phase(-z / a))
        aim = ["repeatability = 0 %", "target = 10 um pk"]
        runs = trials({"A": [z, a]}, [("P", 0.02, 30)])
        (f,) = findings(stream_of(sheet({"P": [f"positions = {(want + 60) % 360} deg"]}, runs, aim)), "target-missed")
        self.assertIn("at 'A' (26.0 of 10.0 um pk expected): positions, stock or limits", f["text"])
        self.assertEqual(findings(stream_of(sheet({"P": []}, runs, aim)), "target-missed"), [])
        runs = trials({"A": [z, a], "B": [-0.5 * z, a]}, [("P", 0.02, 30)])
        (f,) = findings(stream_of(sheet({"P": []}, runs, aim)), "target-missed")
        self.assertIn("even the ideal weight leaves much", f["text"])
        runs = trials({"A": [z, a], "B": [0.8 * z, a]}, [("P", 0.02, 30)])  # 3 um each way
        (f,) = findings(stream_of(sheet({"P": []}, runs, ["repeatability = 0 %", "target = 1 um pk"])), "target-missed")
        self.assertRegex(f["text"], "3.00 of 1.00 um pk expected.: even the ideal weight leaves more than the target")

    def test_pulls_hard_and_shows_little(self):
        """20 g at 100 mm and 1200 rpm: 32 N of 147 N, and 20 um of 150: neither a larger nor a smaller weight is advised alone."""
        runs = trials({"A": [150 * cmath.exp(1j), 1000 * cmath.exp(2.5j)]}, [("P", 0.02, 30)])
        for mass, hard in ((30, True), (300, False)):
            stream = stream_of(sheet({"P": []}, runs, ["repeatability = 1 %"], rotor=[f"mass = {mass} kg", "service speed = 1200 rpm"])
                               + "[limits]\ncorrection-force = none\n")
            told = {f["check"]: f["text"] for f in chain.kind(stream, "finding") if f["verdict"] == "caution"}
            self.assertEqual("weight-force" in told, hard)
            self.assertEqual("use a larger trial weight" in told["trial-effect"], not hard)
            self.assertEqual("pulls hard already" in told["trial-effect"], hard)

    def test_done_is_of_what_is_on(self):
        """The run that meets the aim is what the forecast and the rest are relative to, said to stay on or not."""
        z, a = 30 * cmath.exp(1j), 1000 * cmath.exp(2.5j)
        deg = math.degrees(cmath.phase(-z / a))
        runs = trials({"A": [z, a]}, [("P", 0.02, 30)])
        runs.append(("fitted", {"A": complex(z + a * chain.weight(0.028, deg))}, [("P", 0.028, deg)]))
        for own in ([], ["mounted = fitted"]):
            stream = stream_of(sheet({"P": []}, runs, ["repeatability = 0 %", "target = 10 um pk", *own]))
            (step,), (f,), (c,) = (chain.kind(stream, k) for k in ("next", "forecast", "correction"))
            self.assertEqual(step["step"], "done")
            for key in ("before", "after"):
                self.assertAlmostEqual(abs(chain.vector(f[key])) * 1e6, 2, delta=1e-6)  # 2 g of 30 g are left
            self.assertEqual(c["relative_to"], "fitted")
            self.assertAlmostEqual(c["mass"], 0.002, delta=1e-9)

    def test_limits_that_exclude_all(self):
        z, a = 30 * cmath.exp(1j), 1000 * cmath.exp(2.5j)
        runs = trials({"A": [z, a]}, [("P", 0.02, 30)])
        for own, says in ((["stock = 10 g", "most = 5 g"], "smallest piece 10.0 g, most 5.00 g"),
                          (["positions = 2 from 0 deg", "taken = 1 2"], "all positions of 'P' are taken")):
            step = self.step(sheet({"P": own}, runs), 5)
            self.assertIn(says, step["text"])

    def test_without_phase(self):
        """What each further run of the amplitude method is for; two answers are both told, in the sheet's sense."""
        z, a = 30 + 0j, 1000 * cmath.exp(2.5j)
        weights = [(0.02, 0), (0.02, 120), (0.02, 240)]
        runs = [("as-found", {"A": abs(z)}, [])]
        runs += [(f"t{k}", {"A": abs(z + a * chain.weight(*w))}, [("P", *w)]) for k, w in enumerate(weights)]
        for angles, sign in (("against rotation", 1), ("with rotation", -1)):
            own = [(n, r, [(p, m, sign * d) for p, m, d in w]) for n, r, w in runs]
            text = [self.step(sheet({"P": []}, own[:n], angles=angles), code)["text"] for n, code in ((1, 0), (2, 5), (3, 5))]
            self.assertIn("the same weight at three angles", text[0])
            self.assertIn("run with the same weight at two more angles in turn", text[1])
            found = re.search(r"two answers that fit alike, (\d+) g at (\d+) deg or (\d+) g at (\d+) deg " + angles, text[2])
            told = [(float(found[k]), float(found[k + 1]) * sign) for k in (1, 3)]
            want = 30, math.degrees(cmath.phase(-z / a))  # 30 g at 37 deg
            self.assertTrue(any(abs(g - want[0]) <= 1 and abs(chain.turn(d, want[1])) <= 1 for g, d in told), told)
            for grams, deg in told:  # both explain the three amplitudes: with response -z/w
                w = chain.weight(grams / 1000, deg)
                for (mass, at), (_, got, _) in zip(weights, runs[1:3]):
                    self.assertAlmostEqual(abs(z - z / w * chain.weight(mass, at)), got["A"], delta=1.5)
            self.assertEqual(self.step(sheet({"P": []}, own, angles=angles), 0)["step"], "correct")

    def test_a_trial_without_a_size(self):
        """Only what the sheet lacks is asked for."""
        runs = [("as-found", {"A": 30 * cmath.exp(1j)}, [])]
        for rotor, lacks in ((["mass = 200 kg"], "the sheet must give its service speed$"),
                             (["service speed = 1200 rpm"], "the sheet must give its rotor's mass$"),
                             ([], "the sheet must give its rotor's mass and its service speed$")):
            self.assertRegex(self.step(sheet({"P": []}, runs, rotor=rotor), 0)["text"], lacks)
        rotor = ["mass = 200 kg", "service speed = 1200 rpm"]
        self.assertNotIn("must give", self.step(sheet({"P": []}, runs, rotor=rotor), 0)["text"])

    def test_pieces_against_each_other(self):
        """Only 40 g pieces for 20.7 g: exact by two, 150 deg apart; without that 19.3 g are left, by one."""
        grams = 80 * math.cos(math.radians(75))
        truth = {"A": [grams * cmath.exp(1j), 1000 * cmath.exp(1j * (1 + math.pi))]}  # at 0 deg
        plane = {"P": ["positions = 24 from 0 deg", "stock = 40 g", "pieces = 2"]}
        for angles, phase in SENSES:
            stream = stream_of(sheet(plane, trials(truth, [("P", 0.02, 30)]), angles=angles, phase=phase))
            self.assertEqual(sorted(round(p["sheet_deg"]) for p in chain.kind(stream, "placement")), [75, 285])
            (step,) = chain.kind(stream, "next")
            last = step["others"][0]
            left = min(abs(grams - sum(chain.weight(40, d) for d in set_)) for set_ in
                       [[15 * i, 15 * j] for i in range(-4, 5) for j in range(-4, 5)] + [[15 * i] for i in range(-4, 5)])
            self.assertAlmostEqual(left, 40 - grams, delta=1e-9)
            self.assertEqual([round(p["sheet_deg"]) for p in last["items"]], [0])
            self.assertTrue(last["unopposed"])
            self.assertAlmostEqual(last["of_nothing"], left / grams, delta=1e-6)
            self.assertIn("pieces on 'P' work partly against each other (80 g for an ideal of 21 g); the first alternative "
                          "does with 40 g; it leaves an expected 93 % instead of 0", step["text"])
            self.assertFalse(any("unopposed" in o for o in step["others"][1:]))
            data = "".join(json.dumps(r) + "\n" for r in stream).encode()
            for form in ("text", "html"):
                said = " ".join(chain.lopside("report", "--as", form, stdin=data).stdout.decode().split())
                self.assertEqual(said.count(", without pieces that work against each other"), 1)
        plane["P"][1] = "stock = 5 10 20 g"  # 20 g at 0 deg, and no more than a degree or a gram is missed
        (step,) = chain.kind(stream_of(sheet(plane, trials(truth, [("P", 0.02, 30)]), ["repeatability = 2 %"])), "next")
        self.assertNotIn("against each other", step["text"])
        self.assertFalse(any("unopposed" in o for o in step["others"]))

    def test_pieces_that_cancel_in_part(self):
        """Coarse pieces for 63.2 g at 103 deg: what is placed sums to the ideal, the first alternative does with less."""
        a = 30 * cmath.exp(2.1j)
        truth = {"A": [complex(-a * chain.weight(63.2, 103)), 1000 * a]}
        plane = {"P": ["positions = 12 from 0 deg", "stock = 20 50 g"]}
        stream = stream_of(sheet(plane, trials(truth, [("P", 0.05, 30)])))
        (step,) = chain.kind(stream, "next")
        placed = sum(p["mass"] for p in chain.kind(stream, "placement"))
        first = step["others"][0]
        self.assertGreater(placed, 1.5 * 0.0632)  # else this job tests nothing
        self.assertTrue(first["unopposed"])
        self.assertLess(sum(i["mass"] for i in first["items"]), placed)
        self.assertIn(f"({1000 * placed:.4g} g for an ideal of 63 g)", step["text"])
        spread = [(i["sheet_deg"] - 103 + 180) % 360 - 180 for i in first["items"]]
        self.assertLessEqual(max(map(abs, spread)), 60)
        left = abs(truth["A"][0] + 1000 * a * sum(chain.weight(i["mass"], i["sheet_deg"]) for i in first["items"]))
        self.assertAlmostEqual(first["of_nothing"], left / abs(truth["A"][0]), delta=1e-6)

    def test_a_weight_that_would_pull_too_hard(self):
        z, a = 30 * cmath.exp(1j), 1000 * cmath.exp(2.5j)
        rotor = ["mass = 10 kg", "service speed = 1200 rpm"]  # 30 g at 0.1 m: 47 N of 49 N
        step = self.step(sheet({"P": []}, trials({"A": [z, a]}, [("P", 0.003, 30)]), rotor=rotor), 5)
        self.assertIn("no weight is given, because the one found on 'P', 30.0 g, would pull with 47 N", step["text"])


class Contradiction(unittest.TestCase):
    """Runs that do not fit one set of responses: who is to blame, where that can be known."""

    Z, A = 30 * cmath.exp(1j), 1000 * cmath.exp(2.5j)
    AIM = ["repeatability = 1 %"]

    def runs(self, count, bad=None, factor=1.0):
        """As found, trials of 20 g at 30, 150, 270 deg, as found again; the readings of `bad` times `factor`."""
        plan = [("as-found", None), ("t1", 30), ("t2", 150), ("t3", 270), ("again", None)][:count]
        out = []
        for name, deg in plan:
            w = chain.weight(0.02, deg) if deg is not None else 0
            turn = factor if name == bad else 1.0
            out.append((name, {"A": complex((self.Z + self.A * w) * turn), "B": complex(1j * self.Z + 0.7 * self.A * w)},
                        [("P", 0.02, deg)] if deg is not None else []))
        return out

    def solved(self, runs, code=0, aim=(), base=AIM):
        with chain.folder() as where:
            (where / "job.ini").write_text(sheet({"P": []}, runs, [*base, *aim]))
            done = chain.lopside("balance", where / "job.ini", "--as", "json")
        self.assertEqual(done.returncode, code, chain.complaint(done))
        return json.loads(done.stdout), done.stderr.decode()

    def test_a_spare_run_is_left_out(self):
        """One reading of five turned: the others say so; answer, responses and repeat are made without it."""
        for bad in ("t1", "t2", "t3", "again"):
            stream, said = self.solved(self.runs(5, bad, cmath.exp(0.9j) if bad != "again" else -1))
            refused = [f for f in findings(stream, "linearity") if f["verdict"] == "refuse"]
            if bad == "again":  # two readings of equal weights: `repeat` refuses both, the trials say the same
                self.assertEqual(refused, [])
            else:
                self.assertEqual([(f["run"], f["sensor"]) for f in refused], [(bad, "A")])
                self.assertEqual(said.count("\n"), 1)
                self.assertRegex(said, f"goes on without what it refused: '{bad}' .sensor 'A': linearity")
            for r in chain.kind(stream, "response"):
                size = {"A": 1, "B": 0.7}[r["sensor"]]
                self.assertLess(abs(chain.vector(r["vector"]) / (1e-6 * self.A * size) - 1), 1e-6)
            self.assertEqual(len(chain.kind(stream, "response")), 2)
            (f,) = [f for f in chain.kind(stream, "forecast") if f["sensor"] == "A"]
            self.assertLess(abs(chain.vector(f["before"]) / (1e-6 * self.Z) - 1), 1e-6)

    def test_one_spare_run_blames_nobody(self):
        stream, said = self.solved(self.runs(3, "t2", cmath.exp(0.9j)), 4, ["target A = 10 um pk"])
        (f,) = [f for f in findings(stream, "linearity") if f["verdict"] == "refuse"]
        self.assertIsNone(f["run"])
        self.assertIn("any one may be wrong of 'as-found', 't1' or 't2'", f["text"])
        (step,) = chain.kind(stream, "next")
        self.assertEqual(step["step"], "repeat")
        self.assertIn("any one may be wrong of", step["text"])
        self.assertIn("which is wrong cannot be told", said)
        self.assertEqual([r["sensor"] for r in chain.kind(stream, "response")], ["B"])
        for kind in ("correction", "placement", "forecast"):
            self.assertEqual(chain.kind(stream, kind), [])

    def test_a_misfit_below_the_limit_is_loud(self):
        stream, _ = self.solved(self.runs(3, "t2", 1.15))
        (f,) = [f for f in findings(stream, "linearity") if f["sensor"] == "A"]
        self.assertEqual(f["verdict"], "caution")
        (step,) = chain.kind(stream, "next")
        self.assertRegex(step["text"], "^first see why the runs do not fit one set of responses .linearity, .* s.e. at sensor 'A'")

    def test_a_wrong_sense_gives_no_weight(self):
        """Lags noted with the other sign: two trials 120 deg apart say so at twice the caution, unless the sheet sets more."""
        z, a = self.Z, self.A
        for apart, code in ((120, 4), (180, 0)):
            runs = trials({"A": [z, a]}, [("P", 0.02, 30)])
            runs.append(("second", {"A": complex(z + a * chain.weight(0.02, 30 + apart))}, [("P", 0.02, 30 + apart)]))
            stream, _ = self.solved([(n, {"A": r["A"].conjugate()}, w) for n, r, w in runs], code, base=["repeatability = 3 %"])
            (f,) = findings(stream, "lag-follows-weight")
            if code == 0:  # a mirror looks the same: nothing is called in order
                self.assertIsNone(f["value"])
                self.assertRegex(f["text"], "^not checkable .* stand 180 deg apart")
                continue
            self.assertEqual((f["verdict"], f["limit"]), ("refuse", 6))
            self.assertIn("counted the other way", f["text"])
            self.assertIn("counted the other way", chain.kind(stream, "next")[0]["text"])
            for kind in ("correction", "placement", "forecast", "response"):
                self.assertEqual(chain.kind(stream, kind), [])
        wide = [(n, {"A": r["A"].conjugate()}, w) for n, r, w in runs[:2]]
        wide.append(("second", {"A": complex(z + a * chain.weight(0.02, 150)).conjugate()}, [("P", 0.02, 150)]))
        text = sheet({"P": []}, wide, ["repeatability = 3 %"]) + "[limits]\nlag-follows-weight = 100 s.e.\nlinearity = 100 s.e.\n"
        (f,) = findings(stream_of(text, 5), "lag-follows-weight")  # 5: nothing helps within that misfit
        self.assertEqual((f["verdict"], f["limit"]), ("ok", 100))

    def test_a_trial_too_small_still_testifies(self):
        """A trial of 4 s.e. with the wrong sense, then a correction that made it worse: 30 um at 50 g, lags mirrored."""
        z, a = self.Z, self.A
        small = complex(z + a * chain.weight(0.0055, 90))
        fitted = chain.weight(0.05, 0)
        for sign, code in ((1, 0), (-1, 4)):
            turned = lambda v: v if sign > 0 else v.conjugate()
            runs = [("as-found", {"A": turned(z)}, []), ("trial", {"A": turned(small)}, [("P", 0.0055, 90)]),
                    ("fitted", {"A": turned(complex(z + a * fitted))}, [("P", 0.05, 0)])]
            stream, _ = self.solved(runs, code, base=["repeatability = 3 %", "mounted = fitted"])
            self.assertEqual([f["verdict"] for f in chain.kind(stream, "finding") if (f["check"], f["run"]) == ("trial-effect", "trial")], ["refuse"])
            told = [f["verdict"] for f in findings(stream, "prediction") if f["run"] == "trial"]
            self.assertEqual(told, [] if code == 0 else ["refuse"])
            if code == 0:
                self.assertGreater(abs(z + a * fitted), 1.2 * abs(z))  # else this job tests nothing
                (f,) = findings(stream, "correction-worse")
                self.assertIn("the answer rests on that run alone", f["text"])
                self.assertRegex(chain.kind(stream, "next")[0]["text"], "^run 'fitted' is worse than as found")

    def test_what_moved_gives_no_weight(self):
        """Lags shifted, or sensors exchanged, in the last run of three: as read the runs do not fit, moved back they do."""
        turned = cmath.exp(-0.7j)
        for case in ("tape", "swap", "none"):
            runs = self.runs(3)
            last = runs[2][1]
            if case == "tape":
                last.update({k: v * turned for k, v in last.items()})
            elif case == "swap":
                last["A"], last["B"] = last["B"], last["A"]
            stream, said = self.solved(runs, 0 if case == "none" else 4, base=["repeatability = 3 %"])
            told = [f["check"] for f in chain.kind(stream, "finding")
                    if f["verdict"] == "caution" and f["check"] in ("tape-moved", "sensor-swapped")]
            self.assertEqual(told[:1], {"tape": ["tape-moved"], "swap": ["sensor-swapped"], "none": []}[case])
            if case != "none":
                self.assertRegex(chain.kind(stream, "next")[0]["text"], "would fit .* times better if")
                self.assertEqual(chain.kind(stream, "placement") + chain.kind(stream, "response"), [])

    def test_done_though_the_sheet_is_in_doubt(self):
        """30 g are wanted at 94 deg; the last run meets the aim, but lists its weight 15 deg off: said behind `done`."""
        at = math.degrees(cmath.phase(-self.Z / self.A))
        for off in (0, 15):
            runs = [(n, {"A": r["A"]}, w) for n, r, w in self.runs(2)]
            runs.append(("fitted", {"A": complex(self.Z + self.A * chain.weight(0.029, at))}, [("P", 0.029, at + off)]))
            stream, _ = self.solved(runs, 0, ["target = 3 um pk"], ["repeatability = 2 %"])
            (step,) = chain.kind(stream, "next")
            self.assertEqual(step["step"], "done")
            self.assertEqual("but the runs do not fit one set of responses" in step["text"], off > 0, step["text"])

    def test_an_angle_written_wrong_in_one_condition(self):
        """Hot as cold but for a trial that is listed 120 deg off; a response that turns by 40 deg with warmth is ordinary."""
        for listed, turn, told in ((30, 0.7, False), (150, 0, True)):
            runs = [(n, r, w, ["condition = cold"]) for n, r, w in self.runs(2)]
            warm = cmath.exp(1j * turn)
            w = chain.weight(0.02, 30)
            hot = [("hot", {"A": self.Z, "B": 1j * self.Z}, []),
                   ("hot trial", {"A": complex(self.Z + warm * self.A * w), "B": complex(1j * self.Z + warm * 0.7 * self.A * w)},
                    [("P", 0.02, listed)])]
            runs += [(n, r, x, ["condition = hot"]) for n, r, x in hot]
            stream = self.any_end(runs)
            self.assertEqual([round(f["value"]) for f in findings(stream, "response-turned")], [120] if told else [])

    def any_end(self, runs):
        with chain.folder() as where:
            (where / "job.ini").write_text(sheet({"P": []}, runs, ["repeatability = 3 %"]))
            done = chain.lopside("balance", where / "job.ini", "--as", "json")
        self.assertIn(done.returncode, (0, 5), chain.complaint(done))
        return json.loads(done.stdout)

    def test_a_trial_weight_left_on(self):
        """A correction run with the trial still on is named as such; a run whose weight is 90 % off is not."""
        for on, off in ((1, 1), (0, 1.9)):
            w, t = chain.weight(0.012, 200), chain.weight(0.02, 30)
            runs = self.runs(2)
            runs.append(("fitted", {"A": complex(self.Z + self.A * (off * w + on * t))}, [("P", 0.012, 200)]))
            runs = [(n, {"A": r["A"]}, x) for n, r, x in runs]
            with chain.folder() as where:
                (where / "job.ini").write_text(sheet({"P": []}, runs, ["repeatability = 2 %"]))
                done = chain.lopside("balance", where / "job.ini", "--as", "json")
            (f,) = findings(json.loads(done.stdout), "linearity")
            self.assertNotEqual(f["verdict"], "ok")
            said = "the weights of run 't1' had still been on in run 'fitted'"
            self.assertEqual(said in f["text"], on == 1, f["text"])

    def test_refused_and_never_tried(self):
        """A trial without effect, and a plane that nobody tried: refused readings lead, in every stage."""
        runs = [("as-found", {"A": self.Z}, []), ("t1", {"A": complex(self.Z * 1.001)}, [("P", 0.02, 30)])]
        with chain.folder() as where:
            (where / "job.ini").write_text(sheet({"P": [], "Q": []}, runs, ["repeatability = 3 %"]))
            data, codes = chain.through(["read", "track", "average"], b"", read=[where / "job.ini"]), []
            for stage in ("vet", "solve", "report"):
                done = chain.lopside(stage, stdin=data)
                data = done.stdout
                codes.append(done.returncode)
            self.assertEqual(codes, [4, 4, 4])
            self.assertEqual(chain.lopside("balance", where / "job.ini").returncode, 4)

    def test_done_is_never_said_of_refused_readings(self):
        aim = ["repeatability = 3 %", "target = 100 um pk"]
        runs = [("as-found", {"A": self.Z}, []), ("t1", {"A": complex(self.Z * 1.001)}, [("P", 0.02, 30)])]
        self.assertEqual(Step.step(self, sheet({"P": []}, runs, aim), 4)["step"], "repeat")
        (step,) = chain.kind(stream_of(sheet({"P": []}, runs[:1], aim)), "next")
        self.assertEqual(step["step"], "done")

    def test_a_reading_of_nothing(self):
        """0 is a legal reading; what there is to say about it is said, and never that memory is out."""
        for repeatability in ("0 %", "3 %"):
            for found, tried in ((0j, 5 + 1j), (0j, 0j), (5 + 1j, 0j)):
                runs = [("as-found", {"A": found}, []), ("t1", {"A": tried}, [("P", 0.02, 30)])]
                with chain.folder() as where:
                    (where / "job.ini").write_text(sheet({"P": []}, runs, [f"repeatability = {repeatability}"]))
                    done = chain.lopside("balance", where / "job.ini")
                self.assertIn(done.returncode, (0, 4, 5), (found, tried, chain.complaint(done)))
                self.assertNotIn(b"memory", done.stderr)
                self.assertNotIn(b"nan", done.stdout.lower())


if __name__ == "__main__":
    unittest.main()
