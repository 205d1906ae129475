"""fuzz_stream.py - mutated streams and sheets through the stages behind `track`.

    LOPSIDE=build/src/lopside python3 tests/fuzz/fuzz_stream.py [ROUNDS [SEED]]

Whatever comes in: an exit code of the contract, one line for each failure, no signal, no NaN in what goes out, and no
placement behind a job that has not its last record. The suite runs a short slice; long campaigns run by hand.
"""
import json
import os
import pathlib
import random
import re
import subprocess
import sys
import tempfile

LOPSIDE = os.environ["LOPSIDE"]
DATA = pathlib.Path(__file__).resolve().parents[2] / "data"
CHAIN = ["track", "average", "vet", "solve"]
EXTREME = [0, -1, 1e300, -1e300, 1e-300, 2**31, 2**32 + 1, -2**63, 2**63 - 1, None, True, "", "x" * 300, [], {}, [[]], "NaN"]


def run(arguments, data=b"", where=None):
    return subprocess.run([LOPSIDE, *map(str, arguments)], input=data, capture_output=True, cwd=where, timeout=120)


def seeds():
    """The stream of the fan after each stage that no longer holds samples."""
    data = run(["read", DATA / "fan" / "job.ini"]).stdout
    streams = {}
    for stage in CHAIN:
        data = run([stage], data).stdout
        streams[stage] = data.splitlines(keepends=True)
    return streams


def spots(value, path=()):
    """Every place in a record where something stands."""
    yield path
    items = value.items() if isinstance(value, dict) else enumerate(value) if isinstance(value, list) else ()
    for key, inner in list(items)[:40]:
        yield from spots(inner, path + (key,))


def change_value(line, rng):
    record = json.loads(line)
    path = rng.choice([p for p in spots(record) if p])
    at = record
    for key in path[:-1]:
        at = at[key]
    if isinstance(at, dict) and rng.random() < 0.2:
        del at[path[-1]]
    else:
        at[path[-1]] = rng.choice(EXTREME)
    return json.dumps(record, separators=(",", ":")).encode() + b"\n"


def change_bytes(line, rng):
    line = bytearray(line)
    for _ in range(rng.randint(1, 4)):
        line[rng.randrange(len(line))] = rng.randrange(256)
    return bytes(line)


def mutate(lines, rng):
    lines = list(lines)
    for _ in range(rng.randint(1, 3)):
        i = rng.randrange(len(lines))
        how = rng.random()
        if how < 0.15:
            lines.insert(rng.randrange(len(lines)), lines[i])
        elif how < 0.3 and len(lines) > 1:
            del lines[i]
        elif how < 0.4:
            lines = lines[: i + 1]
        elif how < 0.5:
            lines[i] = change_bytes(lines[i], rng)
        else:
            try:
                lines[i] = change_value(lines[i], rng)
            except ValueError:  # an earlier round has made it unreadable
                pass
    if rng.random() < 0.7:  # a right count, so that the mutation itself is met
        lines = [line for line in lines if b'"kind":"end"' not in line]
        lines.append(json.dumps({"kind": "end", "records": len(lines)}, separators=(",", ":")).encode() + b"\n")
    return b"".join(lines)


def complain(what, done, data):
    kept = pathlib.Path(tempfile.mkstemp(prefix="fuzz-", suffix=".jsonl")[1])
    kept.write_bytes(data)
    raise SystemExit(f"{what}: exit {done.returncode}, {done.stderr[:300]!r}, input kept in {kept}")


def judge(stage, done, data):
    errors = done.stderr.decode("utf-8", "replace").splitlines()
    if done.returncode not in range(6):
        complain(f"{stage}: no exit code of the contract", done, data)
    if done.returncode in (1, 2, 3) and len(errors) != 1:
        complain(f"{stage}: not one line", done, data)
    if re.search(rb"[:\[,]-?(nan|inf)", done.stdout, re.IGNORECASE):
        complain(f"{stage}: a NaN goes out", done, data)
    if stage == "report" and done.returncode in (1, 2) and done.stdout:
        complain("report: part of an answer", done, data)
    if stage != "report" and done.returncode == 0 and b'"kind":"end"' not in done.stdout:
        complain(f"{stage}: done without an end", done, data)


def fuzz_streams(rounds, rng):
    streams = seeds()
    for _ in range(rounds):
        at = rng.randrange(len(CHAIN))
        data = mutate(streams[CHAIN[at]], rng)
        for stage in CHAIN[at + 1 :] + ["report"]:
            done = run([stage], data)
            judge(stage, done, data)
            if done.returncode in (1, 2, 3):
                break
            data = done.stdout


def fuzz_sheets(rounds, rng):
    text = (DATA / "blower" / "job.ini").read_bytes()
    words = [b"=", b"[", b"]", b"#", b'"', b"\n", b" 1e9 g", b"-", b"\xff", b"\0", b"at position 99", b"0"]
    with tempfile.TemporaryDirectory() as name:
        where = pathlib.Path(name)
        for file in (DATA / "blower").glob("*.csv"):
            (where / file.name).write_bytes(file.read_bytes()[:20000])
        for _ in range(rounds):
            sheet = bytearray(text)
            for _ in range(rng.randint(1, 5)):
                i = rng.randrange(len(sheet))
                sheet[i : i + rng.choice([0, 0, 1, 8])] = rng.choice(words)
            (where / "job.ini").write_bytes(sheet)
            done = run(["read", "job.ini"], where=where)
            if done.returncode not in range(4) or (done.returncode and not done.stderr):
                complain("read", done, bytes(sheet))


def main():
    rounds = int(sys.argv[1]) if len(sys.argv) > 1 else 200
    seed = int(sys.argv[2]) if len(sys.argv) > 2 else 1
    rng = random.Random(seed)
    fuzz_streams(rounds, rng)
    fuzz_sheets(rounds, rng)
    print(f"{rounds} streams and {rounds} sheets from seed {seed}")


if __name__ == "__main__":
    main()
