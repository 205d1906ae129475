#!/usr/bin/python3
"""bench_audit.py BUILD [COUNT] - detection and false alarms of all checks of one recording, on COUNT steady recordings.

Prints the table; tests/chain/test_checks.py asserts a slice of it. The memory of an audit of 500 recordings stands
at the end.
"""
import collections
import os
import pathlib
import subprocess
import sys

top = pathlib.Path(__file__).resolve().parents[2]
build = pathlib.Path(sys.argv[1]).resolve()
os.environ.setdefault("LOPSIDE", str(build / "src/lopside"))
os.environ.setdefault("SIMULATE", str(build / "tests/sim/simulate"))
sys.path.insert(0, str(top / "tests/chain"))
import audits  # noqa: E402
import chain  # noqa: E402
import recordings  # noqa: E402


def table():
    with chain.folder() as where:
        rows = audits.detection(where)
    print(f"{'check':18}{'wrong':46}{'wanted':9}{'got':9}good side")
    for check, wrong, verdict, got, good, got_good in rows:
        print(f"{check:18}{str(wrong):46}{verdict:9}{str(got):9}{good} {got_good}")


def alarms(count):
    bad = collections.Counter()
    runs = 0
    for first in range(0, count, 100):
        with chain.folder() as where:
            found = audits.false_alarms(where, min(100, count - first), first)
        runs += len(found)
        for list_ in found.values():
            bad.update({f"{f['check']} {f['verdict']}" for f in list_})
    print(f"false alarms: {runs} of {count} steady recordings, {100 * runs / count:.2f} %; {dict(bad)}")


def memory(count):
    """Peak of every stage in an audit of `count` recordings of 5 s."""
    with chain.folder() as where:
        paths = [where / f"r{k:03}.wav" for k in range(count)]
        for k, path in enumerate(paths):
            recordings.write(path, k, seconds=5.0)
        (where / "audit.ini").write_text(recordings.SHEET)
        source, peaks = os.devnull, {}
        for stage in [*chain.STAGES[:4], "report"]:
            args = ["read", where / "audit.ini", *paths] if stage == "read" else [stage]
            with open(source, "rb") as data, open(where / stage, "wb") as out:
                subprocess.run([build / "tests/chain/peak", where / "note", chain.LOPSIDE, *map(str, args)],
                               stdin=data, stdout=out, check=True)
            peaks[stage] = int((where / "note").read_text().split()[-1])
            source = where / stage
    print(f"{count} recordings, peak KiB: {peaks}")


if __name__ == "__main__":
    table()
    alarms(int(sys.argv[2]) if len(sys.argv) > 2 else 1000)
    memory(10)
    memory(500)
