"""chain.py - what the chain tests share: the program, the simulator, streams as records, sheets.

The paths of the two programs come from the environment: LOPSIDE, SIMULATE.
"""
import cmath
import contextlib
import json
import math
import os
import pathlib
import subprocess
import tempfile

LOPSIDE = os.environ["LOPSIDE"]
SIMULATE = os.environ["SIMULATE"]
DATA = pathlib.Path(__file__).resolve().parents[2] / "data"
STAGES = ["read", "track", "average", "vet", "solve"]


def lopside(*args, stdin=b"", cwd=None):
    """Runs the program; gives the finished process with bytes in stdout and stderr."""
    return subprocess.run([LOPSIDE, *map(str, args)], input=stdin, capture_output=True, cwd=cwd, timeout=300)


def complaint(done):
    return done.stderr.decode("utf-8", "replace")


def through(stages, data, code=0, read=()):
    """Bytes through stages by hand. `read`: arguments of the first stage, if it is `read`."""
    for stage in stages:
        done = lopside(stage, *read, stdin=data) if stage == "read" else lopside(stage, stdin=data)
        last = stage == stages[-1]
        if done.returncode != (code if last else 0):
            raise AssertionError(f"{stage} gave {done.returncode}: {complaint(done)}")
        data = done.stdout
    return data


def records(data):
    """Records of a stream without samples."""
    return [json.loads(line) for line in data.decode().splitlines()]


def kind(stream, name):
    return [r for r in stream if r["kind"] == name]


def solved(sheet, code=0):
    """Records after `solve` for that sheet."""
    return records(through(STAGES, b"", code, read=[sheet]))


def vector(pair):
    return complex(pair[0], pair[1])


def weight(mass, angle_deg):
    return cmath.rect(mass, math.radians(angle_deg))


def lag(z):
    return math.degrees(cmath.phase(z)) % 360


def turn(a, b):
    """Difference of two angles in degrees, (-180, 180]."""
    return (a - b + 180) % 360 - 180


@contextlib.contextmanager
def folder():
    with tempfile.TemporaryDirectory(prefix="lopside-") as name:
        yield pathlib.Path(name)


def simulate(spec, where):
    """Writes the job of a specification (a dict) into the folder; gives its truth."""
    where.mkdir(parents=True, exist_ok=True)
    path = where / "spec.json"
    path.write_text(json.dumps(spec))
    subprocess.run([SIMULATE, path, where], check=True, timeout=120)
    return json.loads((where / "truth.json").read_text())
