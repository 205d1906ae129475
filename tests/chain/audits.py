"""audits.py - folders of recordings as one audit, and what it found."""
import chain
import recordings


def audit(where, paths):
    """The findings of an audit over these recordings: {run: [finding...]}, and the whole stream after vet."""
    sheet = where / "audit.ini"
    sheet.write_text(recordings.SHEET)
    data = chain.lopside("read", sheet, *paths)
    if data.returncode not in (0, 3):
        raise AssertionError(chain.complaint(data))
    stream = chain.records(chain.through(["track", "average", "vet"], data.stdout))
    found = {}
    for finding in chain.kind(stream, "finding"):
        found.setdefault(finding["run"], []).append(finding)
    return found, stream


def worst(findings, check=None):
    verdicts = [f["verdict"] for f in findings if check in (None, f["check"])]
    return max(verdicts, key=recordings.WORSE.get, default=None)


def detection(where):
    """Audits every case of recordings.DETECTION; rows (check, what, expected, got, good side, got)."""
    paths = []
    for k, (_, wrong, _, good) in enumerate(recordings.DETECTION):
        for side, what in (("bad", wrong), ("good", good)):
            paths.append(where / f"{side}{k}.wav")
            recordings.write(paths[-1], 100 + k, **what)
    found, _ = audit(where, paths)
    return [(check, wrong, verdict, worst(found[f"bad{k}"], check), good, worst(found[f"good{k}"], check))
            for k, (check, wrong, verdict, good) in enumerate(recordings.DETECTION)]


def false_alarms(where, count, first=0):
    """Audits steady recordings; the findings that are not ok, {run: [finding...]} of those that have some."""
    paths = []
    for k in range(count):
        paths.append(where / f"steady{first + k}.wav")
        recordings.steady(paths[-1], first + k)
    found, _ = audit(where, paths)
    for path in paths:
        path.unlink()
    assert len(found) == count
    return {run: bad for run, list_ in found.items() if (bad := [f for f in list_ if f["verdict"] != "ok"])}
