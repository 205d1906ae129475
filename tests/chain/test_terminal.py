"""test_terminal.py - what `balance` shows on a terminal while the work is long, and never elsewhere."""
import os
import pathlib
import pty
import re
import select
import signal
import subprocess
import time
import unittest

import chain

SHEET = """[job]
angles = against rotation
[recording]
full scale = 10 V
[tacho]
channel = 2
[sensor DE-V]
channel = 1
unit = g
scale = 100 mV/g
[plane wheel]
radius = 410 mm
[run as-found]
file = silent.wav
"""
LONG = 40_000_000  # bytes; nobody reads so much before a stage can be held
SHORT = 400_000


def silent(path, size):
    """A sound file of zeros that takes no room on the disk."""
    head = (b"RIFF" + (size + 36).to_bytes(4, "little") + b"WAVEfmt " + (16).to_bytes(4, "little") +
            (1).to_bytes(2, "little") + (2).to_bytes(2, "little") + (10000).to_bytes(4, "little") +
            (40000).to_bytes(4, "little") + (4).to_bytes(2, "little") + (16).to_bytes(2, "little") +
            b"data" + size.to_bytes(4, "little"))
    path.write_bytes(head)
    os.truncate(path, len(head) + size)


def children(pid):
    return [int(p) for p in pathlib.Path(f"/proc/{pid}/task/{pid}/children").read_text().split()]


def hold_track(pid):
    """Stops the second stage of a `balance` as soon as it is there."""
    deadline = time.monotonic() + 60
    while len(children(pid)) < 2:
        if time.monotonic() > deadline:
            raise AssertionError("no second stage after a minute")
        time.sleep(0.0005)
    track = children(pid)[1]
    os.kill(track, signal.SIGSTOP)
    return track


def drain(fd, seconds=0.0, until_end=False):
    shown, deadline = b"", time.monotonic() + (60 if until_end else seconds)
    while time.monotonic() < deadline:
        if select.select([fd], [], [], 0.05)[0]:
            try:
                got = os.read(fd, 65536)
            except OSError:
                return shown
            if not got:
                return shown
            shown += got
    return shown


class Terminal(unittest.TestCase):
    def run_held(self, size, hold):
        """`balance` on a terminal, its second stage held for that many seconds (0: not at all)."""
        with chain.folder() as top:
            silent(top / "silent.wav", size)
            (top / "job.ini").write_text(SHEET)
            pid, fd = pty.fork()
            if pid == 0:
                os.chdir(top)
                os.execv(chain.LOPSIDE, [chain.LOPSIDE, "balance", "job.ini"])
            shown = b""
            if hold:
                track = hold_track(pid)
                shown = drain(fd, hold)
                os.kill(track, signal.SIGCONT)
            shown += drain(fd, until_end=True)
            return os.waitstatus_to_exitcode(os.waitpid(pid, 0)[1]), shown.decode()

    def test_long_work(self):
        code, shown = self.run_held(LONG, 3.5)
        self.assertEqual(code, 4, shown)  # there is no signal
        line = re.search(r"\r(\d+) % of 40 MB(, \d+ MB/s, \d+ s left)?", shown)
        self.assertTrue(line, shown)
        self.assertLess(int(line[1]), 100)
        # the line is taken away before anything else is said
        self.assertRegex(shown, r"\r {72}\r(lopside|Balance|job|silent|[^\r]*\n)")
        self.assertNotIn("left", shown.split("\r" + " " * 72 + "\r")[-1].split("\n")[0])

    def test_short_work(self):
        """What takes less than two seconds shows nothing on its way."""
        for _ in range(5):  # a busy machine may need longer for it: then it is no short work
            began = time.monotonic()
            shown = self.run_held(SHORT, 0)[1]
            if time.monotonic() - began < 1.9:
                self.assertNotIn(" MB", shown)
                return
        self.fail("0.4 MB took two seconds five times over")

    def test_no_terminal(self):
        with chain.folder() as top:
            silent(top / "silent.wav", LONG)
            (top / "job.ini").write_text(SHEET)
            held = subprocess.Popen([chain.LOPSIDE, "balance", "job.ini"], cwd=top, stdout=subprocess.PIPE,
                                    stderr=subprocess.PIPE)
            track = hold_track(held.pid)
            time.sleep(2.8)
            os.kill(track, signal.SIGCONT)
            said = held.communicate(timeout=60)[1]
            self.assertNotIn(b"% of", said)
            self.assertNotIn(b"\r", said)


if __name__ == "__main__":
    unittest.main()
