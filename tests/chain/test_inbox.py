"""test_inbox.py - scripts/inbox over folders of jobs: whole results or none, once per content, whatever is killed.

INBOX_KILLS and INBOX_JOBS set the size of the campaign of kills (the suite runs a slice of it).
"""
import contextlib
import csv
import io
import os
import re
import pathlib
import random
import shutil
import signal
import subprocess
import time
import unittest
import wave

import chain

INBOX = pathlib.Path(__file__).resolve().parents[2] / "scripts" / "inbox"
KILLS = int(os.environ.get("INBOX_KILLS", "15"))
JOBS = int(os.environ.get("INBOX_JOBS", "6"))
RESULT = {".content", "report.html", "report.txt", "status", "stream.jsonl"}

BY_HAND = """[job]
title = {title}
angles = against rotation
phase = lag
[rotor]
mass = 340 kg
service speed = 1480 rpm
[sensor DE-V]
unit = mm/s
show = mm/s rms
[plane wheel]
radius = 410 mm
positions = 12 from 0 deg
stock = 10 20 50 g
[run as-found]
speed = 1480 rpm
reading DE-V = 7.2 mm/s rms at 143 deg
[run trial]
speed = 1480 rpm
reading DE-V = 4.9 mm/s rms at 85 deg
weight wheel = 60 g at 30 deg
"""


def command(inbox, outbox, *options, program=chain.LOPSIDE):
    return [INBOX, "--program", program, *options, inbox, outbox]


def run(inbox, outbox, *options, **also):
    return subprocess.run(command(inbox, outbox, *options, **also), capture_output=True, text=True, timeout=300)


def put(inbox, name, files, ready=True):
    """A job: texts by file names."""
    job = inbox / name
    job.mkdir(parents=True)
    for file, text in files.items():
        (job / file).write_bytes(text if isinstance(text, bytes) else text.encode())
    if ready:
        (job / "READY").touch()
    return job


def recorded(inbox, name, title="Fan", audit=False):
    sheet = (chain.DATA / "fan" / "job.ini").read_text().replace("Grain dryer, exhaust fan", title)
    files = {p.name: p.read_bytes() for p in (chain.DATA / "fan").glob("*.wav")}
    return put(inbox, name, {"job.ini": sheet[:sheet.index("[run ")] if audit else sheet, **files})


def tree(folder):
    """What is in a folder, to the byte and the nanosecond."""
    return {str(p.relative_to(folder)): (p.stat().st_mtime_ns, p.read_bytes() if p.is_file() else None)
            for p in folder.rglob("*")}


def result(folder):
    return {p.name: p.read_bytes() for p in folder.iterdir()}


def results(outbox):
    return {p.name: result(p) for p in outbox.iterdir() if not p.name.startswith(".")}


def status(outbox, name):
    text = (outbox / name / "status").read_text()
    return int(text.split()[0]), text.strip()


def fill(inbox, count):
    """`count` jobs, three of them bad."""
    for i in range(count - 3):
        if i % 5 == 0:
            recorded(inbox, f"recorded {i}", title=f"Fan {i}")
        else:
            put(inbox, f"hand-{i}", {"job.ini": BY_HAND.format(title=f"Fan {i}")})
    put(inbox, "bad sheet", {"job.ini": BY_HAND.format(title="x").replace("radius", "radios")})
    recorded(inbox, "bad gone")
    (inbox / "bad gone" / "trial.wav").unlink()
    recorded(inbox, "bad junk")
    (inbox / "bad junk" / "trial.wav").write_bytes(random.Random(1).randbytes(50000))


class Inbox(unittest.TestCase):
    def setUp(self):
        box = chain.folder()
        self.top = box.__enter__()
        self.addCleanup(box.__exit__, None, None, None)
        self.inbox, self.outbox = self.top / "in", self.top / "out"
        self.inbox.mkdir()

    def clean(self):
        """Nothing half-done is left."""
        state = self.outbox / ".inbox"
        for name in ("making", "old"):
            self.assertEqual(list((state / name).iterdir()), [], name)
        self.assertEqual({p.name for p in state.iterdir()}, {"lock", "log", "main", "making", "old", "seen"})

    def test_answers(self):
        fill(self.inbox, 6)
        put(self.inbox, "not yet", {"job.ini": BY_HAND.format(title="x")}, ready=False)
        put(self.inbox, "no sheet", {})
        before = tree(self.inbox)
        done = run(self.inbox, self.outbox)
        self.assertEqual(done.returncode, 3, done.stderr)
        self.assertEqual(done.stderr, "")
        self.assertEqual(done.stdout.splitlines()[0], "lopside inbox: 7 jobs: 3 answered, 0 refused or without a "
                         "correction, 4 bad, 0 failed, 0 still changing")
        self.assertEqual(len(done.stdout.splitlines()), 5)
        self.assertEqual({n: status(self.outbox, n)[0] for n in results(self.outbox)},
                         {"recorded 0": 0, "hand-1": 0, "hand-2": 0, "bad sheet": 2, "bad gone": 3, "bad junk": 3,
                          "no sheet": 2})
        self.assertIn("and 1 more, see report.txt", status(self.outbox, "bad sheet")[1])
        self.assertIn("radios", (self.outbox / "bad sheet" / "report.txt").read_text())
        self.assertIn("trial.wav", status(self.outbox, "bad gone")[1])
        for name, files in results(self.outbox).items():
            bad = name.startswith("bad") or name == "no sheet"
            self.assertEqual(set(files), RESULT - {"stream.jsonl"} if bad else RESULT, name)
        chained = chain.through(chain.STAGES, b"", read=[self.inbox / "hand-1" / "job.ini"])
        self.assertEqual((self.outbox / "hand-1" / "stream.jsonl").read_bytes(), chained)
        self.assertEqual((self.outbox / "hand-1" / "report.txt").read_bytes(),
                         chain.lopside("report", stdin=chained).stdout)
        self.assertEqual(tree(self.inbox), before)
        self.clean()

    def test_once_per_content(self):
        put(self.inbox, "a", {"job.ini": BY_HAND.format(title="first")})
        put(self.inbox, "b", {"job.ini": BY_HAND.format(title="other")})
        self.assertEqual(run(self.inbox, self.outbox).returncode, 0)
        first = tree(self.outbox / "a")
        (self.inbox / "a" / "job.ini").touch()
        again = run(self.inbox, self.outbox)
        self.assertEqual((again.returncode, again.stdout, tree(self.outbox / "a")), (0, "", first))
        other = tree(self.outbox / "b")
        (self.inbox / "a" / "job.ini").write_text(BY_HAND.format(title="second"))
        again = run(self.inbox, self.outbox)
        self.assertIn("1 jobs: 1 answered", again.stdout)
        self.assertIn("second", (self.outbox / "a" / "report.txt").read_text())
        self.assertEqual(tree(self.outbox / "b"), other)
        (self.inbox / "a" / "job.ini").rename(self.inbox / "a" / "sheet.ini")  # a name is content, too
        self.assertEqual(run(self.inbox, self.outbox).returncode, 3)
        self.assertEqual(status(self.outbox, "a")[0], 2)
        self.clean()

    def test_content_is_looked_at_though_no_time_tells(self):
        job = put(self.inbox, "a", {"job.ini": BY_HAND.format(title="first")})
        times = (job / "job.ini").stat()
        run(self.inbox, self.outbox)
        time.sleep(4.2)  # whole seconds count; from here on an untouched job is known without reading it
        run(self.inbox, self.outbox)
        self.assertTrue((self.outbox / ".inbox" / "seen" / "a").exists())
        (job / "job.ini").write_text(BY_HAND.format(title="later"))
        os.utime(job / "job.ini", ns=(times.st_atime_ns, times.st_mtime_ns))
        self.assertIn("1 answered", run(self.inbox, self.outbox).stdout)
        self.assertIn("later", (self.outbox / "a" / "report.txt").read_text())

    def test_status_tells_what_to_read_first(self):
        # 12 positions and pieces of 10 g leave far more than 0.01 mm/s of 7.2
        put(self.inbox, "a", {"job.ini": BY_HAND.format(title="x") + "[aim]\ntarget = 0.01 mm/s rms\n"})
        put(self.inbox, "b", {"job.ini": BY_HAND.format(title="x")})
        self.assertEqual(run(self.inbox, self.outbox).returncode, 0)
        for name in "ab":
            stream = chain.records((self.outbox / name / "stream.jsonl").read_bytes())
            cautions = [f["check"] for f in chain.kind(stream, "finding") if f["verdict"] == "caution"]
            self.assertEqual("target-missed" in cautions, name == "a")
            self.assertIn("weight-force", cautions)  # 590 N against half of 340 kg
            self.assertEqual(status(self.outbox, name)[1], "0 done, next: correct" + (
                ", target not expected" if name == "a" else "") + f"; cautions: {len(cautions)}")

    def test_audit(self):
        job = recorded(self.inbox, "audit", audit=True)
        (job / "photo.jpg").write_bytes(b"x")
        self.assertEqual(run(self.inbox, self.outbox).returncode, 0)
        self.assertEqual(status(self.outbox, "audit"), (0, "0 done (files that are no recordings: 1)"))
        readings = chain.kind(chain.records((self.outbox / "audit" / "stream.jsonl").read_bytes()), "reading")
        self.assertEqual({r["run"] for r in readings}, {"as-found", "as-found-again", "trial"})
        (job / "cut.wav").write_bytes((job / "trial.wav").read_bytes()[:9000])
        self.assertEqual(run(self.inbox, self.outbox).returncode, 3)
        self.assertEqual(status(self.outbox, "audit")[0], 3)
        self.assertIn("cut.wav", status(self.outbox, "audit")[1])
        self.assertEqual(set(result(self.outbox / "audit")), RESULT)  # the others are audited all the same
        stream = chain.records((self.outbox / "audit" / "stream.jsonl").read_bytes())
        (bad,) = [f for f in chain.kind(stream, "finding") if f["check"] == "readable"]
        self.assertEqual((bad["verdict"], bad["basis"]), ("refuse", "common practice"))
        table = chain.lopside("report", "--as", "csv", self.outbox / "audit" / "stream.jsonl").stdout.decode()
        row = [r for r in csv.DictReader(io.StringIO(table, newline="")) if r["run"] == "cut"]
        self.assertEqual([(r["sensor"], r["used"], r["verdict"]) for r in row], [("", "no", "refuse")])

    def test_audit_of_nothing(self):
        put(self.inbox, "a", {"job.ini": "[tacho]\nchannel = 1\n[sensor S]\nchannel = 2\nunit = g\n", "notes.pdf": "x"})
        self.assertEqual(run(self.inbox, self.outbox).returncode, 3)
        self.assertEqual(status(self.outbox, "a"), (
            2, "2 lopside inbox: no recording in the folder, and no [run] in its job.ini (files that are no recordings: 1)"))
        self.assertIn("no recording in the folder", (self.outbox / "a" / "report.txt").read_text())
        self.assertEqual(set(result(self.outbox / "a")), RESULT - {"stream.jsonl"})

    def test_refused_readings_are_counted(self):
        """0 means that there is an answer: what was refused on the way stands beside it, in the reports, too."""
        job = recorded(self.inbox, "audit", audit=True)
        for path in job.glob("*.wav"):  # the first second of each: some 16 turns of 985 rpm
            with wave.open(str(path)) as whole:
                head, part = whole.getparams(), whole.readframes(whole.getframerate())
            with wave.open(str(path), "wb") as cut:
                cut.setparams(head)
                cut.writeframes(part)
        self.assertEqual(run(self.inbox, self.outbox).returncode, 0)
        self.assertEqual(status(self.outbox, "audit")[0], 0)
        self.assertIn("0 done; REFUSED: 6 of 6 readings", status(self.outbox, "audit")[1])
        for name in ("report.txt", "report.html"):
            text = " ".join((self.outbox / "audit" / name).read_text().split())
            self.assertIn("6 refused", text)
            self.assertIn("NONE of these readings is fit to balance on", text)
        (job / "gone.wav").write_bytes(b"RIFF no recording")
        self.assertEqual(run(self.inbox, self.outbox).returncode, 3)
        self.assertRegex(status(self.outbox, "audit")[1], r"^3 lopside read: .*gone.wav.*; REFUSED: 6 of 6 readings$")

    def test_a_recording_without_a_reading_is_counted(self):
        """The tacho's channel (the last) set to zero: of that recording nothing can be read; text and page have a row for it."""
        job = recorded(self.inbox, "audit", audit=True)
        with wave.open(str(job / "trial.wav")) as whole:
            head, data = whole.getparams(), bytearray(whole.readframes(whole.getnframes()))
        frame = head.nchannels * head.sampwidth
        for at in range(0, len(data), frame):
            data[at + frame - head.sampwidth:at + frame] = bytes(head.sampwidth)
        with wave.open(str(job / "trial.wav"), "wb") as mute:
            mute.setparams(head)
            mute.writeframes(bytes(data))
        self.assertEqual(run(self.inbox, self.outbox).returncode, 0)
        self.assertRegex(status(self.outbox, "audit")[1], "^0 done; without a reading: 1")
        for name in ("report.txt", "report.html"):
            text = " ".join(re.sub("<[^>]*>", " ", (self.outbox / "audit" / name).read_text()).split())
            self.assertIn("1 of the recordings gave no reading", text)
            self.assertRegex(text, r"trial( -){7} REFUSED")

    def test_tolerance_not_met_is_in_the_status(self):
        """G0.001 of 340 kg is less than any piece; no correction leaves so little."""
        for name, grade in (("a", "G0.001"), ("b", "G1000")):
            text = BY_HAND.format(title="x")
            self.assertNotIn("grade", text)
            put(self.inbox, name, {"job.ini": text.replace("[rotor]\n", "[rotor]\ngrade = " + grade + "\n")})
        self.assertEqual(run(self.inbox, self.outbox).returncode, 0)
        self.assertIn("; tolerance NOT MET", status(self.outbox, "a")[1])
        self.assertNotIn("tolerance", status(self.outbox, "b")[1])

    def test_a_broken_section_is_no_audit(self):
        put(self.inbox, "a", {"job.ini": BY_HAND.format(title="x").replace("[job]", "[job").replace("[run ", "[rum ")})
        self.assertEqual(run(self.inbox, self.outbox).returncode, 3)
        self.assertRegex(status(self.outbox, "a")[1], r"^2 lopside read: job.ini:1: section header without '\]': '\[job'")

    def test_links(self):
        """A link to a file is a file; a linked folder is not entered, wherever it leads."""
        job = put(self.inbox, "a", {})
        (self.top / "sheet").write_text(BY_HAND.format(title="first"))
        (job / "job.ini").symlink_to(self.top / "sheet")
        (job / "all").symlink_to("/")
        (job / "up").symlink_to("..")
        (job / "broken").symlink_to("nowhere")
        self.assertEqual(run(self.inbox, self.outbox).returncode, 0)
        self.assertEqual(run(self.inbox, self.outbox).stdout, "")
        (self.top / "sheet").write_text(BY_HAND.format(title="second"))
        self.assertEqual(run(self.inbox, self.outbox).returncode, 0)
        self.assertIn("second", (self.outbox / "a" / "report.txt").read_text())

    def test_taken_back(self):
        job = put(self.inbox, "a", {"job.ini": BY_HAND.format(title="x")})
        back = self.program(f'rm -f "{job}/READY"; exec "$lopside" "$@"')
        done = run(self.inbox, self.outbox, program=back)
        self.assertEqual((done.returncode, done.stdout, results(self.outbox)), (0, "", {}))
        self.clean()

    def test_refused(self):
        sheet = BY_HAND.format(title="x").replace("4.9 mm/s rms at 85", "7.2 mm/s rms at 143")  # no effect at all
        put(self.inbox, "a", {"job.ini": sheet})
        done = run(self.inbox, self.outbox)
        self.assertEqual(done.returncode, 4, done.stdout + done.stderr)
        self.assertIn(status(self.outbox, "a")[0], (4, 5))
        self.assertEqual(set(result(self.outbox / "a")), RESULT)

    def test_names(self):
        names = ["-rf", "a b", "new\nline", "$(touch x)", "*", "@", "Gebläse", "a'b\"c", "x]", "\\"]
        for name in names:
            put(self.inbox, name, {"job.ini": BY_HAND.format(title="x")})
        job = recorded(self.inbox, "strange recordings", audit=True)
        (job / "trial.wav").rename(job / "-.wav")
        (job / "as-found.wav").rename(job / "-o.wav")
        self.assertEqual(run(self.inbox, self.outbox).returncode, 0)
        self.assertEqual(set(results(self.outbox)), {*names, "strange recordings"})
        self.assertEqual({status(self.outbox, n)[0] for n in results(self.outbox)}, {0})

    def program(self, text):
        path = self.top / "program"
        path.write_text(f"#!/bin/bash\nlopside='{chain.LOPSIDE}'\n{text}\n")
        path.chmod(0o755)
        return path

    def test_changed_while_read(self):
        job = put(self.inbox, "a", {"job.ini": BY_HAND.format(title="first")})
        once = self.program(f'[ "$1" != solve ] || [ -e "{self.top}/was" ] || '
                            f'{{ touch "{self.top}/was"; sed -i s/first/second/ "{job}/job.ini"; }}\n'
                            'exec "$lopside" "$@"')
        done = run(self.inbox, self.outbox, program=once)
        self.assertEqual(done.returncode, 0)
        self.assertIn("changed while it was read", (self.outbox / ".inbox" / "log").read_text())
        self.assertIn("second", (self.outbox / "a" / "report.txt").read_text())
        always = self.program(f'[ "$1" != solve ] || echo >>"{job}/more"\nexec "$lopside" "$@"')
        old = result(self.outbox / "a")
        (job / "more").touch()
        done = run(self.inbox, self.outbox, program=always)
        self.assertIn("0 answered", done.stdout)
        self.assertIn("1 still changing", done.stdout)
        self.assertEqual(result(self.outbox / "a"), old)
        self.clean()

    def test_system_failure_is_tried_three_times(self):
        put(self.inbox, "a", {"job.ini": BY_HAND.format(title="x")})
        broken = self.program('if [ "$1" = average ]; then kill -KILL $$; fi; exec "$lopside" "$@"')
        for _ in range(3):
            done = run(self.inbox, self.outbox, program=broken)
            self.assertEqual(done.returncode, 1, done.stdout)
            self.assertEqual(status(self.outbox, "a")[0], 1)
        self.assertEqual(run(self.inbox, self.outbox, program=broken).stdout, "")
        (self.outbox / "a").rename(self.top / "taken away")  # who takes a result away has it made again
        self.assertEqual(run(self.inbox, self.outbox).returncode, 0)
        self.assertEqual(status(self.outbox, "a")[0], 0)

    def test_one_that_hangs_does_not_block(self):
        put(self.inbox, "a", {"job.ini": BY_HAND.format(title="hang")})
        put(self.inbox, "b", {"job.ini": BY_HAND.format(title="x")})
        hangs = self.program('[ "$1" != read ] || ! grep -q hang job.ini || exec sleep 60\nexec "$lopside" "$@"')
        done = run(self.inbox, self.outbox, "--longest", "5s", "-j", "1", program=hangs)
        self.assertEqual(done.returncode, 1)
        self.assertEqual((status(self.outbox, "a")[0], status(self.outbox, "b")[0]), (1, 0))
        self.assertIn("longer than 5s", status(self.outbox, "a")[1])

    def test_misuse(self):
        for args in ([], [self.inbox], [self.top / "none", self.outbox], [self.inbox, self.inbox / "out"],
                     ["-j", "0", self.inbox, self.outbox], ["--odd", self.inbox, self.outbox]):
            done = subprocess.run([INBOX, "--program", chain.LOPSIDE, *args], capture_output=True, text=True)
            self.assertEqual(done.returncode, 2, args)
            self.assertEqual(len(done.stderr.splitlines()), 1)
        self.assertEqual(list(self.inbox.iterdir()), [])
        self.assertEqual(subprocess.run([INBOX, "--help"], stdout=subprocess.DEVNULL).returncode, 0)

    def test_what_is_not_a_result_is_left(self):
        put(self.inbox, "a", {"job.ini": BY_HAND.format(title="x")})
        (self.outbox / "a").mkdir(parents=True)
        (self.outbox / "a" / "mine").touch()
        self.assertEqual(run(self.inbox, self.outbox).returncode, 1)
        self.assertEqual(set(result(self.outbox / "a")), {"mine"})

    def test_two_at_once(self):
        fill(self.inbox, 8)
        expected = self.top / "expected"
        run(self.inbox, expected)
        both = [subprocess.Popen(command(self.inbox, self.outbox), stdout=subprocess.PIPE, text=True)
                for _ in range(2)]
        said = [p.communicate(timeout=200)[0] for p in both]
        self.assertEqual(results(self.outbox), results(expected))
        self.assertEqual(sum("8 jobs" in text for text in said), 1, said)
        self.assertEqual(sorted(p.returncode for p in both), [0, 3])
        log = (self.outbox / ".inbox" / "log").read_text()
        self.assertEqual(log.count("taken up"), 8)
        self.clean()

    def test_killed(self):
        seed = int(os.environ.get("INBOX_SEED", "4"))
        dice = random.Random(seed)
        fill(self.inbox, JOBS)
        expected_box = self.top / "expected"
        began = time.monotonic()
        run(self.inbox, expected_box)
        whole = time.monotonic() - began
        expected, before = results(expected_box), tree(self.inbox)
        self.assertEqual(len(expected), JOBS)
        cut, i = 0, -1  # kills that found work under way
        while cut < KILLS * 2 // 3:  # a run that ended before its kill has left work for none: what it made is taken away
            i += 1
            self.assertLess(i, 20 * KILLS, "hardly a kill finds work under way")
            victim = subprocess.Popen(command(self.inbox, self.outbox), stdout=subprocess.DEVNULL,
                                      stderr=subprocess.DEVNULL, start_new_session=True)
            time.sleep(dice.uniform(0.02, whole))
            cut += victim.poll() is None
            if cut % 2:
                with contextlib.suppress(ProcessLookupError):
                    os.killpg(victim.pid, signal.SIGKILL)  # everything
            else:
                victim.kill()  # the script alone: its workers live on
            victim.wait()
            seen = results(self.outbox)
            for name, files in seen.items():
                self.assertEqual(files, expected[name], f"kill {i}, {name}")
            if len(seen) == JOBS:
                for name in dice.sample(sorted(seen), JOBS * 2 // 3):  # work for the next ones
                    shutil.rmtree(self.outbox / name, ignore_errors=True)
        self.assertEqual(run(self.inbox, self.outbox).stderr, "")
        deadline = time.monotonic() + 60  # a worker that outlived its killed script may still be at work
        while any((self.outbox / ".inbox" / "making").iterdir()) and time.monotonic() < deadline:
            time.sleep(0.2)
            run(self.inbox, self.outbox)
        self.assertEqual(results(self.outbox), expected)
        self.assertEqual(tree(self.inbox), before)
        self.clean()
        print(f"{i + 1} kills over {JOBS} jobs, {cut} while at work, seed {seed}")

    def test_killed_while_replacing(self):
        """The one moment without a result in its place: the old one is put back."""
        put(self.inbox, "a", {"job.ini": BY_HAND.format(title="x")})
        run(self.inbox, self.outbox)
        old = result(self.outbox / "a")
        (self.outbox / "a").rename(self.outbox / ".inbox" / "old" / "a")
        self.assertEqual(run(self.inbox, self.outbox).stdout, "")
        self.assertEqual(result(self.outbox / "a"), old)
        self.clean()

    def test_clears_up_after_jobs_that_went(self):
        put(self.inbox, "a", {"job.ini": BY_HAND.format(title="x")})
        run(self.inbox, self.outbox)
        (self.outbox / ".inbox" / "making" / "a" / "result").mkdir(parents=True)
        shutil.rmtree(self.inbox / "a")
        self.assertEqual(run(self.inbox, self.outbox).returncode, 0)
        self.assertEqual(list((self.outbox / ".inbox" / "lock").iterdir()), [])
        self.assertEqual(set(results(self.outbox)), {"a"})
        self.clean()


if __name__ == "__main__":
    unittest.main()
