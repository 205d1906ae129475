"""test_audit.py - an audit of many recordings: each verdict is that of the recording alone, and memory does not grow.

500 recordings: tests/bench/bench_audit.py, by hand.
"""
import os
import subprocess
import unittest

import audits
import chain
import recordings

WRONG = [{}, {"two_x": 0.8}, {"seconds": 3.0}, {"rpm": 1600.0}, {"first": "constant"}, {"missing": 0.4}, {"beat": 0.3},
         {"tacho": False}, {"drift": 0.12}, {"rails": 12}]


def write_all(where, count, **more):
    """Recordings with all kinds of faults, and every tenth no recording at all."""
    paths = []
    for k in range(count):
        paths.append(where / f"machine {k:02}.wav")
        if k % 10 == 9:
            paths[-1].write_bytes(b"RIFF no recording")
        else:
            recordings.write(paths[-1], 300 + k, **({"seconds": 6.0} | more | WRONG[k % len(WRONG)]))
    return paths


def vet_peak(where, averaged):
    """Peak resident memory of vet over a stream, KiB."""
    with averaged.open("rb") as source, open(os.devnull, "wb") as out:
        subprocess.run([os.environ["PEAK"], where / "note", chain.LOPSIDE, "vet"], stdin=source, stdout=out, check=True)
    return int((where / "note").read_text().split()[-1])


class Audit(unittest.TestCase):
    def test_each_verdict_is_that_of_the_recording_alone(self):
        with chain.folder() as where:
            paths = write_all(where, 40)
            found, stream = audits.audit(where, paths)
            self.assertEqual(len(found), 40)
            self.assertNotIn(None, found)  # nothing rests on several of them
            together = {(v["run"], v["sensor"]): v for v in chain.kind(stream, "vetted")}
            for path in paths[:20]:
                alone, own = audits.audit(where, [path])
                self.assertEqual(alone, {path.stem: found[path.stem]})
                for ruling in chain.kind(own, "vetted"):
                    self.assertEqual(ruling, together[ruling["run"], ruling["sensor"]])
            verdicts = [audits.worst(found[p.stem]) for p in paths]
            self.assertEqual(verdicts[9::10], ["refuse"] * 4)
            self.assertEqual(verdicts[0::10], ["ok"] * 4)
            self.assertEqual(verdicts[1::10], ["caution"] * 4)

    def test_exit_codes_and_lines(self):
        with chain.folder() as where:
            paths = write_all(where, 10)
            (where / "audit.ini").write_text(recordings.SHEET)
            read = chain.lopside("read", where / "audit.ini", *paths)
            self.assertEqual(read.returncode, 3)  # some could not be read
            vetted = chain.through(["track", "average", "vet"], read.stdout)  # 0 each: an audit has nothing to refuse
            report = chain.lopside("report", stdin=vetted)
            self.assertEqual(report.returncode, 3)
            for path in paths:
                self.assertIn(path.stem, report.stdout.decode())
            good = chain.lopside("read", where / "audit.ini", *paths[:9])
            self.assertEqual(good.returncode, 0)
            vetted = chain.through(["track", "average", "vet"], good.stdout)
            self.assertEqual(chain.lopside("report", stdin=vetted).returncode, 0)

    @unittest.skipUnless("PEAK" in os.environ, "the sanitizers' own memory would be measured")
    def test_memory(self):
        peaks, sizes = {}, {}
        with chain.folder() as where:
            (where / "audit.ini").write_text(recordings.SHEET)
            for count in (10, 160):
                paths = write_all(where, count, seconds=4.0)
                data = chain.lopside("read", where / "audit.ini", *paths).stdout
                averaged = where / "averaged"
                averaged.write_bytes(chain.through(["track", "average"], data))
                sizes[count] = averaged.stat().st_size // 1024
                peaks[count] = min(vet_peak(where, averaged) for _ in range(3))
        # Peaks of one and the same work differ by 200 KiB, as libraries' pages fall: the contrast must be far above that.
        # What vet keeps of a recording is its readings, a small part of its records: half of those would be too much.
        self.assertGreater(sizes[160] - sizes[10], 2000)
        self.assertLess(peaks[160] - peaks[10], (sizes[160] - sizes[10]) / 2, (peaks, sizes))

    @unittest.skipUnless("PEAK" in os.environ, "the sanitizers' own memory would be measured")
    def test_memory_of_the_page(self):
        """A page of 1,500 recordings of 20 s: the bar of 32 MiB is far from what it takes (23) and from what it took when
        the page, all spectra and all findings in order were held (58)."""
        with chain.folder() as where:
            (where / "audit.ini").write_text(recordings.SHEET)
            paths = write_all(where, 10, seconds=20.0)[:9]
            data = chain.lopside("read", where / "audit.ini", *paths).stdout
            head, *lines, end = chain.through(["track", "average", "vet"], data).decode().splitlines()
            many = where / "many.jsonl"
            with many.open("w") as out:
                out.write(head + "\n")
                for k in range(1500 // 9):
                    out.writelines(line.replace('"run":"machine ', f'"run":"{k:03} machine ') + "\n" for line in lines)
                out.write(f'{{"kind":"end","records":{1 + len(lines) * (1500 // 9)}}}\n')
            with (where / "page.html").open("wb") as page:
                subprocess.run([os.environ["PEAK"], where / "note", chain.LOPSIDE, "report", "--as", "html", many],
                               stdout=page, check=True)
            peak = int((where / "note").read_text().split()[-1])
            self.assertLess(peak, 32 * 1024)
            page = (where / "page.html").read_text()
            self.assertEqual(page.count("166 machine"), 0)
            self.assertIn("165 machine 08", page)
            self.assertTrue(page.endswith("</body></html>\n"))


if __name__ == "__main__":
    unittest.main()
