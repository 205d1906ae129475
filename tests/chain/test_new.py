"""test_new.py - `new` and `check`: from recordings without a sheet to an answer, as a new user would go."""
import os
import pty
import re
import select
import shutil
import subprocess
import time
import unittest
import wave

import numpy

import chain

DEMO = (chain.DATA / "fan" / "job.ini").read_text()
WEIGHT = re.search(r"weight wheel = (.+)", DEMO)[1]
MASS = re.search(r"mass = (.+)", DEMO)[1]
FAN = ["--angles", "against", "--mass", MASS, "--unit", "g", "--scale", "100 mV/g", "--full-scale", "10 V",
       "--plane", "wheel", "--radius", "600 mm", "--positions", "12 from 0 deg", "--stock", "10 20 50 g",
       "--weight", f"trial={WEIGHT}"]


def write_wav(path, columns, rate=2560):
    """Columns of [-1, 1) as 16-bit WAV."""
    samples = numpy.round(numpy.column_stack(columns) * 32767).astype("<i2")
    with wave.open(str(path), "wb") as f:
        f.setnchannels(samples.shape[1])
        f.setsampwidth(2)
        f.setframerate(rate)
        f.writeframes(samples.tobytes())


def on_terminal(args, typed, cwd, env=None):
    """Runs the program on a terminal; gives exit code and all that the terminal showed."""
    pid, fd = pty.fork()
    if pid == 0:
        os.chdir(cwd)
        os.environ.update(env or {})
        os.execv(chain.LOPSIDE, [chain.LOPSIDE, *map(str, args)])
    shown = b""
    deadline = time.monotonic() + 60
    lines = list(typed)
    while time.monotonic() < deadline:
        ready = select.select([fd], [], [], 0.5)[0]
        if ready:
            try:
                got = os.read(fd, 4096)
            except OSError:
                break
            if not got:
                break
            shown += got
            while lines and shown.endswith(b": "):
                line = lines.pop(0)
                os.write(fd, line.encode() + (b"" if line == "\x04" else b"\n"))
                break
    return os.waitstatus_to_exitcode(os.waitpid(pid, 0)[1]), shown.decode("utf-8", "replace")


class New(unittest.TestCase):
    def setUp(self):
        box = chain.folder()
        self.top = box.__enter__()
        self.addCleanup(box.__exit__, None, None, None)

    def put(self, job, *names):
        for name in names:
            shutil.copy(chain.DATA / job / name, self.top)

    def sheet(self, *args, code=0):
        done = chain.lopside("new", *args, cwd=self.top)
        self.assertEqual(done.returncode, code, chain.complaint(done))
        return done.stdout.decode()

    def test_to_an_answer(self):
        """The placement is that of the demo's own sheet, with the same two runs."""
        self.put("fan", "as-found.wav", "trial.wav")
        done = chain.lopside("new", "-o", "job.ini", *FAN, "--speed", "985 rpm", "--target", "1.8 mm/s rms",
                             "as-found.wav", "trial.wav", cwd=self.top)
        self.assertEqual(done.returncode, 0, chain.complaint(done))
        self.assertIn("complete", chain.complaint(done))
        self.assertEqual(chain.lopside("check", "job.ini", cwd=self.top).returncode, 0)
        got = chain.solved(self.top / "job.ini")
        runs = [s for s in re.split(r"(?m)^(?=\[)", DEMO) if not s.startswith("[run as-found again]")]
        runs = [s for s in runs if not s.startswith("[run") or s.startswith(("[run as-found]", "[run trial]"))]
        plain = re.sub(r"(?m)^(pieces|grade|most|taken) = .*\n", "", "".join(runs))
        (self.top / "demo.ini").write_text(plain)
        demo = chain.solved(self.top / "demo.ini")
        self.assertGreater(len(chain.kind(got, "placement")), 0)
        keys = ("plane", "position", "angle_deg", "mass")
        self.assertEqual([[p[k] for k in keys] for p in chain.kind(got, "placement")],
                         [[p[k] for k in keys] for p in chain.kind(demo, "placement")])

    def test_nothing_is_made_up(self):
        self.put("fan", "as-found.wav")
        text = self.sheet("as-found.wav")
        live = [line.split("#")[0].strip() for line in text.splitlines() if line and not line.startswith("#")]
        self.assertEqual([line for line in live if "=" in line],
                         ["title = Untitled", "channel = 3", "channel = 1", "channel = 2", "file = as-found.wav"])
        self.assertRegex(text, r"channel = 3 +# guessed")
        (self.top / "job.ini").write_text(text)
        done = chain.lopside("check", "job.ini", cwd=self.top)
        self.assertEqual(done.returncode, 2)
        self.assertIn("'unit'", chain.complaint(done))

    def test_every_open_line_completes_the_sheet(self):
        """The comments, uncommented, are a sheet that the program takes."""
        for job, first in (("fan", "as-found.wav"), ("blower", "as-found.csv")):
            self.put(job, first)
            text = self.sheet(first)
            lines = [re.sub(r"^# (?=\[|[a-z ]+ = |weight )", "", line) for line in text.splitlines()]
            self.assertNotEqual(lines, text.splitlines())
            (self.top / "all.ini").write_text("\n".join(lines))
            done = chain.lopside("check", "all.ini", cwd=self.top)
            self.assertEqual(chain.complaint(done), "", job)

    def test_columns(self):
        self.put("blower", "as-found.csv")
        text = self.sheet("--rate", "2048 Hz", "as-found.csv")
        for expected in ("[sensor Left H]", "channel = Right H", "unit = mm/s", "rate = 2048 Hz", "channel = Tacho"):
            self.assertIn(expected, text)
        rows = "\n".join(f"{i / 1000:.3f},{i % 7},{20 + i % 3},{i % 5}" for i in range(3000))
        (self.top / "odd.csv").write_text("t,Brg [m/s²],Oil (°C),Brg # 2\n" + rows + "\n")
        text = self.sheet("odd.csv")
        self.assertIn("[sensor Brg]\nchannel = Brg\nunit = m/s2", text)
        self.assertIn("left out, no vibration by its unit: column 'Oil'", text)
        self.assertIn("[sensor Brg _ 2]\nchannel = 4\n", text)
        self.assertNotIn("[sensor t]", text)

    def test_rate_of_a_short_time_column(self):
        """Times in ms over 0.3 s tell the rate to 0.3 %: `read` wants it said, and so the sheet asks for it."""
        rows = "".join(f"{i / 1000:.3f};{i % 7};{(i % 20 == 0) * 3}\n" for i in range(300))
        (self.top / "short.csv").write_text("t;V [mm/s];Pulse\n" + rows)
        text = self.sheet("short.csv")
        self.assertRegex(text, r"# rate = 12800 Hz +# the time column says only: about 1000 Hz")
        self.assertRegex(text, r"channel = Pulse +# guessed: it alone has regular pulses")
        self.sheet("-o", "job.ini", "--rate", "1 kHz", "--angles", "with", "--radius", "1 m", "short.csv")
        self.assertEqual(chain.complaint(chain.lopside("check", "job.ini", cwd=self.top)), "")

    def test_tacho_is_told_or_left_open(self):
        t = numpy.arange(25600) / 2560
        pulses = ((t * 25) % 1 < 0.05) * 0.8
        hum = 0.5 * numpy.sin(2 * numpy.pi * 25 * t)
        noise = 0.1 * numpy.random.default_rng(1).standard_normal(len(t)).clip(-4, 4)
        cases = {"last": ([hum, noise, pulses], "3"), "first": ([pulses, hum + noise], "1"),
                 "noisy": ([hum, pulses + 0.3 * noise - 0.4], "2"), "none": ([hum, noise], None),
                 "both": ([pulses, hum, numpy.roll(pulses, 30)], None)}
        for name, (columns, channel) in cases.items():
            write_wav(self.top / f"{name}.wav", columns)
            text = self.sheet(f"{name}.wav")
            found = re.search(r"(?m)^\[tacho\]\nchannel = (\S+)", text)
            self.assertEqual(found and found[1], channel, name)
            self.assertEqual("1500 rpm" in text, channel is not None)
        self.assertIn("[tacho]\nchannel = 2", self.sheet("--tacho", "2", "both.wav"))
        self.assertNotIn("tacho]", self.sheet("--tacho", "none", "both.wav"))

    def test_files_are_named_from_the_sheet(self):
        (self.top / "sub").mkdir()
        self.put("fan", "as-found.wav")
        shutil.copy(self.top / "as-found.wav", self.top / "sub" / "trial.wav")
        self.sheet("-o", "sub/job.ini", "as-found.wav", "sub/trial.wav", *FAN)
        text = (self.top / "sub" / "job.ini").read_text()
        self.assertIn("file = trial.wav", text)
        self.assertIn(f"file = {self.top.resolve()}/as-found.wav", text)
        self.assertEqual(chain.lopside("check", "sub/job.ini", cwd=self.top).returncode, 0)

    def test_misuse(self):
        self.put("fan", "as-found.wav")
        self.sheet(code=2)
        self.sheet("--angles", "left", "as-found.wav", code=2)
        self.sheet("--weight", "none=3 g", "as-found.wav", code=2)
        self.sheet("--weight", "as-found:x=3 g", "as-found.wav", code=2)
        self.sheet("--weight", "as-found", "as-found.wav", code=2)
        self.sheet("gone.wav", code=3)
        (self.top / "mine.ini").write_text("mine")
        self.sheet("-o", "mine.ini", "as-found.wav", code=2)
        self.assertEqual((self.top / "mine.ini").read_text(), "mine")
        self.sheet("-o", "no/such/folder.ini", "as-found.wav", code=1)
        with open("/dev/full", "wb") as full:
            done = subprocess.run([chain.LOPSIDE, "new", self.top / "as-found.wav"], stdout=full,
                                  stderr=subprocess.DEVNULL)
        self.assertEqual(done.returncode, 1)

    def test_asks_on_a_terminal_only(self):
        self.put("fan", "as-found.wav", "trial.wav")
        typed = ["job.ini", "Fan # 7", "against", "DE-V", "DE-H", "g", "100 mV/g", "10 V", MASS, "", "G6.3", "wheel", "",
                 "600 mm", "12 from 0 deg", "10 20 50 g", "1.8 mm/s rms", "", WEIGHT]
        code, shown = on_terminal(["new", "as-found.wav", "trial.wav"], typed, self.top)
        self.assertEqual(code, 0, shown)
        self.assertIn("written, and complete", shown)
        self.assertIn("70 g at position 3", shown)
        text = (self.top / "job.ini").read_text()
        self.assertIn('title = "Fan # 7"', text)
        self.assertRegex(text, r"(?m)^service speed = 98\d rpm")
        for line in ("[plane wheel]", "[sensor DE-V]", "[sensor DE-H]", "grade = G6.3"):
            self.assertIn(line, text)
        self.assertEqual(len(chain.kind(chain.solved(self.top / "job.ini"), "next")), 1)
        code, shown = on_terminal(["check", "job.ini"], [], self.top, {"TERM": "xterm", "NO_COLOR": ""})
        self.assertEqual(code, 0, shown)
        self.assertNotIn("?", shown)

    def test_a_wrong_answer_is_asked_for_again(self):
        """With the sheet's own words; after three tries it stays open; a file that is there is no answer."""
        self.put("fan", "as-found.wav", "trial.wav")
        (self.top / "mine.ini").write_text("mine")
        typed = ["mine.ini", "job.ini", "", "left", "with", "", "", "furlong", "g", "100 mV", "100 mV/g", "10", "10 V",
                 "340", "340 lbs", "heavy", "", "6.3", "", "", "600", "600 mm", "12 from 0 deg", "", "1.8 mm/s rms",
                 "", "70 g at position 13", "70 g at pos 3", "70 g at position 3"]
        code, shown = on_terminal(["new", "as-found.wav", "trial.wav"], typed, self.top)
        self.assertEqual(code, 0, shown)
        for said in ("is there already, and stays as it is: 'mine.ini'", "not one of 'against rotation'",
                     "no unit, wanted g, kg, oz or lb: 'mass = 340'", "not a grade, wanted G and a number", "stays open in the sheet: 'mass'",
                     "no such position (1 to 12)", "wanted 'MASS at ANGLE deg' or 'MASS at position N'"):
            self.assertIn(said, shown)
        text = (self.top / "job.ini").read_text()
        for line in ("angles = with rotation", "unit = g", "scale = 100 mV/g", "full scale = 10 V", "# mass = 340 kg",
                     "radius = 600 mm", "weight rotor = 70 g at position 3"):
            self.assertRegex(text, "(?m)^" + re.escape(line))

    def told(self, *args):
        (self.top / "job.ini").unlink(missing_ok=True)
        done = chain.lopside("new", "-o", "job.ini", *args, cwd=self.top)
        self.assertEqual(done.returncode, 0, chain.complaint(done))
        return chain.complaint(done)

    def without(self, *names):
        options = list(FAN)
        for name in names:
            at = options.index(name)
            del options[at:at + 2]
        return options

    def test_complete_means_that_check_is_content(self):
        """What `check` refuses is not complete: a full scale, a channel, a file, a trial's weight."""
        self.put("fan", "as-found.wav", "trial.wav")
        both = ["as-found.wav", "trial.wav"]
        cases = ((self.without("--full-scale"), both, "add 'full scale = 10 V' under [recording]"),
                 (FAN + ["--tacho", "7"], both, "no channel 7 for 'tacho', the recording has 3"),
                 (self.without("--weight"), ["as-found.wav", "gone.wav"], "'gone.wav' (run 'gone' of 'job.ini')"),
                 (self.without("--weight"), both, "no run says what was mounted: add 'weight wheel = ... at ...'"))
        for options, files, expected in cases:
            said = self.told(*options, *files)
            self.assertIn(expected, said)
            self.assertNotIn("and complete", said)
            self.assertIn("written, and to be completed", said)
        done = chain.lopside("check", "job.ini", cwd=self.top)
        self.assertIn("no run says what was mounted", done.stdout.decode())
        self.assertIn("written, and complete", self.told(*FAN, *both))

    def test_all_that_is_missing_is_listed_at_once(self):
        self.put("fan", "as-found.wav", "trial.wav")
        said = self.told("--plane", "wheel", "as-found.wav", "trial.wav")
        for line in ("'angles' in [job]", "'full scale' in [recording]", "'unit' in [sensor channel 1]",
                     "'scale' in [sensor channel 2]", "'radius' in [plane wheel]"):
            self.assertIn("missing: " + line, said)
        self.assertNotIn("empty section", said)
        done = chain.lopside("check", "job.ini", cwd=self.top)
        self.assertIn("missing: 'radius' in '[plane wheel]'", chain.complaint(done))

    def test_end_of_answers(self):
        self.put("fan", "as-found.wav")
        code, shown = on_terminal(["new", "as-found.wav"], ["job.ini", "Fan", "\x04"], self.top)
        self.assertEqual(code, 2, shown)
        self.assertIn("nothing was written", shown)
        self.assertFalse((self.top / "job.ini").exists())
        (self.top / "mine.ini").write_text("mine")
        code, shown = on_terminal(["new", "-o", "mine.ini", "as-found.wav"], [], self.top)
        self.assertEqual(code, 2, shown)
        self.assertNotIn("Title", shown)


class Check(unittest.TestCase):
    def setUp(self):
        New.setUp(self)

    def check(self, *args, code=0):
        done = chain.lopside("check", *args, cwd=self.top)
        self.assertEqual(done.returncode, code, chain.complaint(done))
        return done.stdout.decode(), chain.complaint(done)

    def sheet(self, **also):
        text = (chain.DATA / "fan" / "job.ini").read_text()
        head = text[:text.index("[run ")]
        for old, new in also.items():
            head = head.replace(*new) if isinstance(new, tuple) else head
        return head

    def test_demo(self):
        """Speeds and ranges against the recordings read by NumPy."""
        for job in ("fan", "blower"):
            said, complaint = self.check(chain.DATA / job / "job.ini")
            self.assertEqual(complaint, "")
            self.assertIn("0 remarks", said)
            self.assertIn("no mistake in the sheet", said)
        said, _ = self.check(chain.DATA / "fan" / "job.ini")
        with wave.open(str(chain.DATA / "fan" / "as-found.wav")) as f:
            rate, frames = f.getframerate(), f.getnframes()
            x = numpy.frombuffer(f.readframes(20 * rate), "<i2").reshape(-1, 3) / 32768 * 10
        self.assertIn(f"{frames / rate:.4g} s at {rate} Hz", said)
        first = said.split("run 'as-found'")[1].split("run '")[0]
        row = re.search(r"DE-V +1 +(\S+) +(\S+) +(\S+) g", first)
        self.assertAlmostEqual(float(row[1]), x[:, 0].min() / 0.1, delta=5e-4)  # 100 mV/g
        self.assertAlmostEqual(float(row[2]), x[:, 0].max() / 0.1, delta=5e-4)
        self.assertEqual(float(row[3]), 100)
        above = x[:, 2] > (x[:, 2].min() + x[:, 2].max()) / 2
        edges = numpy.flatnonzero(~above[:-1] & above[1:])
        speed = 60 * rate * (len(edges) - 1) / (edges[-1] - edges[0])
        shown = float(re.search(r"([\d.]+) rpm", first)[1])
        self.assertAlmostEqual(shown, speed, delta=0.2)  # rpm; marks to a sample here

    def test_remarks(self):
        t = numpy.arange(25600) / 2560
        pulses = ((t * 985 / 60) % 1 < 0.05) * 0.5
        hum = 0.002 * numpy.sin(2 * numpy.pi * 985 / 60 * t + 0.3)  # 20 mV, 0.2 g, 19 mm/s
        noise = 0.0004 * numpy.random.default_rng(2).standard_normal(len(t))
        cases = {
            "good": ([hum + noise, 0.5 * hum - noise[::-1], pulses], []),
            "dead": ([hum + noise, 0 * hum, pulses], ["DE-H: no signal"]),
            "same": ([hum + noise, hum + noise, pulses], ["DE-V: the same signal as 'DE-H'",
                                                          "DE-H: the same signal as 'DE-V'"]),
            "clip": ([(1000 * (hum + noise)).clip(-1, 1), noise + hum, pulses], ["DE-V: ", "at full scale"]),
            "loud": ([100 * hum, hum + noise, pulses], ["DE-V: implausibly large at 1x", "check scale and full scale"]),
            "still": ([0.05 * noise, hum + noise, pulses], ["DE-V: implausibly small at 1x"]),
            "mute": ([hum + noise, hum - noise[::-1], 0 * t], ["tacho: no signal", "tacho: no regular pulses"]),
            "fast": ([hum + noise, hum - noise[::-1], ((t * 985 / 30) % 1 < 0.05) * 0.5],
                     ["tacho: 1970 rpm, and the service speed is 985 rpm: with 2 pulses a turn it would be 'marks = 2'"]),
            "short": ([c[:2560] for c in (hum + noise, hum - noise[::-1], pulses)], ["length: 16 turns, fewer than 20"]),
        }
        (self.top / "job.ini").write_text(self.sheet())
        for name, (columns, expected) in cases.items():
            write_wav(self.top / f"{name}.wav", columns)
            said, complaint = self.check("job.ini", f"{name}.wav")
            self.assertEqual(complaint, "")
            self.assertEqual(bool(expected), "0 remarks" not in said, said)
            for text in expected:
                self.assertIn(text, said, name)

    def test_remarks_on_the_runs(self):
        """Weights in the run as found; one file twice; a force out of proportion; nothing but weights."""
        self.put = New.put.__get__(self)
        self.put("fan", "as-found.wav", "trial.wav")
        runs = ("[run as-found]\nfile = as-found.wav\n{found}[run again]\nfile = {again}\n{bare}"
                "[run trial]\nfile = trial.wav\nweight wheel = {mass} at position 3\n")
        # Force m r w^2 over half of the rotor's weight, 640 kg * 9.80665 N/kg / 2 (common practice for the load).
        newton = 0.3 * 0.6 * (2 * numpy.pi * 985 / 60) ** 2
        share = 100 * newton / (640 * 9.80665 / 2)
        heavy = f"weights: they pull with {round(newton, -1):.0f} N at 985 rpm, {share:.2g} % of the static journal load"
        shutil.copy(self.top / "as-found.wav", self.top / "copy.wav")
        with wave.open(str(chain.DATA / "fan" / "as-found-again.wav")):
            shutil.copy(chain.DATA / "fan" / "as-found-again.wav", self.top / "again.wav")
        ours = "weight wheel = 10 g at position 2\n"
        cases = (("", "again.wav", "", "70 g", []),
                 (ours, "again.wav", "", "70 g", ["as found: this run carries weights"]),
                 (ours, "again.wav", ours, "70 g", ["as found: this run carries weights",
                                                    "as found: every run carries weights"]),
                 ("", "copy.wav", "", "70 g", ["file: the same content as in 'as-found', to the byte"]),
                 ("", "again.wav", "", "300 g", [heavy, "more than 50 % is refused"]),
                 ("", "again.wav", "", "100 g", ["more than 15 % is much for a trial"]))
        for found, again, bare, mass, expected in cases:
            text = runs.format(found=found, again=again, bare=bare, mass=mass)
            (self.top / "job.ini").write_text(self.sheet() + text)
            said, _ = self.check("job.ini")
            self.assertEqual(said.count("    ! "), len([e for e in expected if not e.startswith("more")]) or
                             len(expected), said)
            for remark in expected:
                self.assertIn(remark, said)

    def test_the_rotor_without_weights(self):
        """Where the run as found carries weights, `read` and the report say what the answer takes off."""
        self.put = New.put.__get__(self)
        self.put("fan", "as-found.wav", "trial.wav")
        text = (self.sheet() + "[run as-found]\nfile = as-found.wav\nweight wheel = 10 g at position 2\n"
                f"[run trial]\nfile = trial.wav\nweight wheel = {WEIGHT}\nweight wheel = 10 g at position 2\n")
        (self.top / "job.ini").write_text(text)
        for form in ("text", "html"):
            done = chain.lopside("balance", "--as", form, "job.ini", cwd=self.top)
            self.assertEqual(done.returncode, 0, chain.complaint(done))
            self.assertIn("lopside read: run 'as-found' carries weights, as found is taken as the rotor without them "
                          "(job.ini)", chain.complaint(done))
            said = " ".join(done.stdout.decode().replace("&#39;", "'").split())
            self.assertIn("without any weight that the sheet lists, those of run 'as-found' included", said)
            self.assertNotIn("take every trial weight off first", said)
        (self.top / "job.ini").write_text(text + "[aim]\nmounted = as-found\n")
        done = chain.lopside("balance", "job.ini", cwd=self.top)
        self.assertEqual(chain.complaint(done), "")

    def test_a_run_named_as_found(self):
        """Records call the rotor without weights 'as found'; a run of just that name is not mistaken for a base."""
        sheet = ("[job]\nangles = with rotation\nphase = lag\n[rotor]\nmass = 600 lb\n[sensor A]\nunit = mil\n"
                 "[plane hub]\nradius = 8 in\n[run as found]\nspeed = 1780 rpm\nreading A = 6.0 mil pk-pk at 45 deg\n{}"
                 "[run trial]\nspeed = 1780 rpm\nreading A = 5.0 mil pk-pk at 90 deg\nweight hub = 1 oz at 0 deg\n{}")
        loaded = "weight hub = 1 oz at 90 deg\n"
        (self.top / "job.ini").write_text(sheet.format("", ""))
        for form in ("text", "html"):
            done = chain.lopside("balance", "--as", form, "job.ini", cwd=self.top)
            self.assertEqual(done.returncode, 0, chain.complaint(done))
            said = " ".join(done.stdout.decode().split())
            self.assertIn("Relative to the rotor as found: first take off all that the runs list, trial and correction "
                          "weights alike: 28.35 g at 0 deg with rotation on plane 'hub' (run 'trial').",
                          said.replace("&#39;", "'"))
            self.assertNotIn("stay on", said.split("FORECAST")[0] if form == "text" else said.split("Forecast")[0])
            self.assertIn("not known", said)  # the force: there is no service speed
        (self.top / "job.ini").write_text(sheet.format(loaded, ""))
        said = chain.lopside("balance", "job.ini", cwd=self.top).stdout.decode()
        self.assertIn("take all of them off first", " ".join(said.split()))
        self.assertNotIn("everything taken off first", " ".join(said.split()))
        (self.top / "job.ini").write_text(sheet.format(loaded, "[aim]\nmounted = as found\n"))
        done = chain.lopside("balance", "job.ini", cwd=self.top)
        self.assertEqual(done.returncode, 2)
        self.assertIn("give this run, whose weights stay on, another name: '[run as found]'", chain.complaint(done))

    def test_perhaps_meant(self):
        """The nearest name of a stage, a run, a file, a sheet; none where nothing is near."""
        self.put = New.put.__get__(self)
        self.put("fan", "as-found.wav", "trial.wav")
        (self.top / "job.ini").write_text(self.sheet() + "[run as-found]\nfile = as-fuond.wav\n[run trial]\n"
                                          f"file = trial.csv\nweight wheel = {WEIGHT}\n")
        cases = ((["blance"], 2, "no such stage: 'blance' (did you mean 'balance'?)"),
                 (["help", "raed"], 2, "no such stage: 'raed' (did you mean 'read'?)"),
                 (["sing"], 2, "no such stage: 'sing' (see"),
                 (["read", "--run", "trail", "job.ini"], 2, "in the sheet: 'trail' (did you mean 'trial'?) (job.ini)"),
                 (["read", "--run", "other", "job.ini"], 2, "in the sheet: 'other' (job.ini)"),
                 (["check", "jobb.ini"], 2, "(did you mean 'job.ini'?)"),
                 (["balance", "job.ini"], 3, "'as-fuond.wav' (did you mean 'as-found.wav'?) (run 'as-found'"),
                 (["read", "--run", "trial", "job.ini"], 3, "'trial.csv' (did you mean 'trial.wav'?) (run 'trial'"),
                 (["report", "--as", "csv", "--what", "placment", "job.ini"], 2,
                  "no such table: 'placment' (one of readings, responses, correction, placement, "),
                 (["new", "--weigth", "x=1", "trial.wav"], 2, "unknown option: '--weigth' (did you mean '--weight'?)"),
                 (["new", "--weight", "trail=1 g at 0 deg", "trial.wav"], 2, "'trail' (did you mean 'trial'?)"))
        for args, code, expected in cases:
            done = chain.lopside(*args, cwd=self.top)
            self.assertEqual(done.returncode, code, chain.complaint(done))
            self.assertIn(expected, chain.complaint(done).splitlines()[0])
            if args[-2:] != ["x=1", "trial.wav"]:
                self.assertEqual(len(chain.complaint(done).splitlines()), 1)

    def test_failures(self):
        (self.top / "job.ini").write_text(self.sheet())
        shutil.copy(chain.DATA / "fan" / "trial.wav", self.top / "good.wav")
        (self.top / "cut.wav").write_bytes((self.top / "good.wav").read_bytes()[:9999])
        write_wav(self.top / "few.wav", [numpy.zeros(5000)])
        said, complaint = self.check("job.ini", "cut.wav", "few.wav", "gone.wav", "good.wav", code=3)
        self.assertEqual(len(complaint.splitlines()), 3)
        self.assertEqual(said.count("cannot be read"), 3)
        self.assertIn("985.", said)  # the good one is looked at all the same
        (self.top / "bad.ini").write_text(self.sheet().replace("radius", "radios"))
        said, complaint = self.check("bad.ini", code=2)
        self.assertEqual(said, "")
        self.assertIn("radios", complaint)
        self.check(code=2)

    def test_weights_and_amplitudes(self):
        """1x of an exact sine: 0.2 g peak at 985 rpm is 0.2 * 9806.65 / (2 pi 985 / 60) / sqrt 2 mm/s rms."""
        t = numpy.arange(25600) / 2560
        hum = numpy.sin(2 * numpy.pi * 985 / 60 * t)
        write_wav(self.top / "a.wav", [0.002 * hum, 0.004 * hum, ((t * 985 / 60) % 1 < 0.05) * 0.5])
        (self.top / "job.ini").write_text(self.sheet() + f"[run a]\nfile = a.wav\nweight wheel = {WEIGHT}\n")
        said, _ = self.check("job.ini")
        got = re.search(r"(?m)^    1x: DE-V (\S+) mm/s rms, DE-H (\S+) mm/s rms$", said)
        self.assertTrue(got, said)
        for value, peak in ((got[1], 0.2), (got[2], 0.4)):
            expected = peak * 9806.65 / (2 * numpy.pi * 985 / 60) / 2 ** 0.5
            self.assertAlmostEqual(float(value), expected, delta=0.01 * expected)
        mass, position = re.search(r"([\d.]+) g at position (\d+)", WEIGHT).groups()
        self.assertRegex(said, rf"(?m)^  weight wheel: {mass} g at [\d.]+ deg \w+ rotation, position {position}$")

    def test_what_to_add_is_named(self):
        """A full scale that is missing: the line to add, the sheet and the run; the same from `balance`."""
        text = (chain.DATA / "fan" / "job.ini").read_text()
        for name in ("as-found", "trial", "as-found-again"):
            if (chain.DATA / "fan" / f"{name}.wav").exists():
                shutil.copy(chain.DATA / "fan" / f"{name}.wav", self.top)
        (self.top / "job.ini").write_text(re.sub(r"(?m)^full scale = .*$", "skip = 0 lines", text))
        said, complaint = self.check("job.ini", code=2)
        self.assertNotIn("cannot be read", said)
        balance = chain.lopside("balance", "job.ini", cwd=self.top)
        self.assertEqual(balance.returncode, 2)
        for told in (complaint, chain.complaint(balance)):
            self.assertIn("add 'full scale = 10 V' under [recording] (volts at digital full scale)", told)
            self.assertIn("(run 'as-found' of 'job.ini')", told)
        (self.top / "job.ini").write_text(text.replace("file = trial.wav", "file = gone.wav"))
        balance = chain.lopside("balance", "job.ini", cwd=self.top)
        self.assertEqual(balance.returncode, 3)
        self.assertIn("'gone.wav' (run 'trial' of 'job.ini')", chain.complaint(balance))

    def test_a_recording_is_no_sheet(self):
        shutil.copy(chain.DATA / "fan" / "trial.wav", self.top)
        (self.top / "x.csv").write_text("t,a\n0,1\n1,2\n")
        for name in ("trial.wav", "x.csv"):
            for command in ("check", "balance"):
                done = chain.lopside(command, name, cwd=self.top)
                self.assertEqual(done.returncode, 2)
                self.assertIn("this is a recording: 'lopside new' makes a sheet", chain.complaint(done))

    def test_colour(self):
        (self.top / "job.ini").write_text(self.sheet())
        write_wav(self.top / "dead.wav", [numpy.zeros(5000)] * 3)
        for env, coloured in (({"TERM": "xterm", "NO_COLOR": ""}, True), ({"TERM": "xterm", "NO_COLOR": "1"}, False),
                              ({"TERM": "dumb", "NO_COLOR": ""}, False)):
            code, shown = on_terminal(["check", "job.ini", "dead.wav"], [], self.top, env)
            self.assertEqual((code, "\033[" in shown), (0, coloured), env)
        self.assertNotIn("\033", self.check("job.ini", "dead.wav")[0])

    def test_units_of_columns(self):
        """A column stands in its sensor's shown unit, or in its own where another quantity is shown. 2 V are 20 g at 100
        mV/g; 1 g is 9.80665 m/s2 (both by definition)."""
        t = numpy.arange(25600) / 2560
        wave_ = 0.2 * numpy.sin(2 * numpy.pi * 985 / 60 * t)  # of 10 V: 2 V peak
        write_wav(self.top / "a.wav", [wave_, 0.5 * wave_, ((t * 985 / 60) % 1 < 0.05) * 0.5])
        head = "[recording]\nfull scale = 10 V\n[tacho]\nchannel = 3\n[sensor S]\nchannel = 1\n"
        for unit, scale, show, said, highest in (
                ("m/s2", "100 mV/g", "mm/s rms", "m/s2", 196.133), ("m/s2", "100 mV/g", "g pk", "g", 20),
                ("g", "100 mV/g", "mm/s rms", "g", 20), ("g", "100 mV/g", "m/s2 rms", "m/s2", 196.133),
                ("mm/s", "100 mV/(mm/s)", "in/s pk", "in/s", 20 / 25.4), ("mil", "100 mV/mil", "mm/s rms", "mil", 20)):
            (self.top / "u.ini").write_text(f"{head}unit = {unit}\nscale = {scale}\nshow = {show}\n")
            text, _ = self.check("u.ini", "a.wav")
            got = re.search(r"(?m)^    S +1 +(\S+) +(\S+) +(\S+) (\S+)$", text)
            self.assertTrue(got, text)
            self.assertEqual(got[4], said)
            self.assertAlmostEqual(float(got[2]), highest, delta=0.01 * highest)

    def test_slow_roll(self):
        sheet = """[job]
angles = against rotation
phase = lag
[rotor]
mass = 10 kg
service speed = 3000 rpm
[sensor S]
unit = {}
[plane wheel]
radius = 200 mm
[run slow]
role = runout
speed = 200 rpm
weight wheel = 500 g at 0 deg
reading S = 10 {} at 10 deg
[run f]
speed = 3000 rpm
reading S = 50 {} at 10 deg
"""
        for unit, shown, effect in (("um", "um pk-pk", True), ("g", "mm/s rms", False)):
            (self.top / "job.ini").write_text(sheet.format(unit, shown, shown))
            said, _ = self.check("job.ini")
            self.assertIn("run 'slow': by hand; slow roll (runout)\n", said)
            self.assertIn("run 'f': by hand\n", said)
            self.assertEqual("has no effect without a displacement probe" in said, not effect)
            self.assertIn("what is mounted at a slow roll (runout) is not counted", said)
            self.assertNotIn("static journal load", said)  # nothing pulls at that speed

    def test_help_everywhere(self):
        plain = chain.lopside("help").stdout
        for args in (["help", "help"], ["help", "--help"], ["help", "-h"], ["--help"], ["-h"], ["--help", "help"]):
            done = chain.lopside(*args)
            self.assertEqual((done.returncode, done.stdout, done.stderr), (0, plain, b""), args)
        for args in (["help", "--version"], ["--version"], ["read", "--version"], ["help", "--version"]):
            done = chain.lopside(*args)
            self.assertEqual((done.returncode, done.stderr), (0, b""), args)
            self.assertRegex(done.stdout, rb"^lopside [0-9.]+\n$")
        self.assertEqual(chain.lopside("help", "--nope").returncode, 2)

    def test_one_line_of_misuse(self):
        for args in (["read", "--nope"], ["read", "--run"], ["balance", "--as"], ["new", "--nope"], ["check", "--nope"]):
            done = chain.lopside(*args)
            self.assertEqual(done.returncode, 2)
            self.assertEqual(len(chain.complaint(done).splitlines()), 1, chain.complaint(done))

    def test_a_report_keeps_its_files_mode(self):
        out = self.top / "report.txt"
        for mode in (0o600, 0o640, 0o666):
            out.write_text("old")
            out.chmod(mode)
            done = chain.lopside("balance", "-o", out, chain.DATA / "fan" / "job.ini")
            self.assertEqual(done.returncode, 0, chain.complaint(done))
            self.assertIn("WHAT TO DO NOW", out.read_text())
            self.assertEqual(out.stat().st_mode & 0o777, mode)

    def test_hostile_words(self):
        text = self.sheet().replace("Grain dryer", "Grain\033[31m dryer")
        (self.top / "job.ini").write_text(text + "[run a]\nfile = x\033]0;y.wav\n")
        done = chain.lopside("check", "job.ini", cwd=self.top)
        self.assertNotIn(b"\033", done.stdout + done.stderr)


if __name__ == "__main__":
    unittest.main()
