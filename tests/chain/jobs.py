"""jobs.py - specifications of invented jobs, drawn by a seed, for the simulator.

Nothing here knows how the program computes: masses, angles, modes and noise are drawn, and the simulator
works out by geometry what that does.
"""
import random

CSV_DIALECTS = [
    {"separator": ";", "decimal": ",", "preamble": 3, "crlf": True, "units": True},
    {"separator": ",", "decimal": ".", "time_name": "Time", "time_digits": 7, "bom": True, "quoted": True},
    {"separator": "\t", "decimal": ".", "preamble": 1},
]


def sensor(draw, name, csv, at_deg):
    """Accelerometer, velocity pickup or probe, in volts or, in a CSV, perhaps in its own unit."""
    unit, scale, volts, size = draw.choice([
        ("g", "100 mV/g", 0.1, 0.04), ("m/s2", "10 mV/(m/s2)", 0.01, 0.4), ("mm/s", "20 mV/(mm/s)", 0.02, 4.0),
        ("um", "8 mV/um", 0.008, 30.0), ("in/s", "500 mV/(in/s)", 0.5, 0.15), ("mil", "200 mV/mil", 0.2, 1.2)])
    own = csv and draw.random() < 0.5
    spec = {"name": name, "unit": unit, "at_deg": at_deg, "show": "mm/s rms", "digits": 6,
            "white": 0.05 * size, "coloured": 0.005 * size, "corner_hz": 6, "offset": draw.uniform(-1, 1) * size,
            "orders": [[2, 0.2 * size, draw.uniform(0, 360)], [3, 0.1 * size, draw.uniform(0, 360)],
                       [0.5, 0.02 * size, draw.uniform(0, 360)]],
            "lines": [[draw.uniform(50, 90), 0.1 * size, 0]]}
    if not own:
        spec |= {"scale": scale, "v_per_unit": volts}
    return spec


def job(seed, planes, form, sense, left_on, mounted=False, bits=24, turning=None, **recording):
    """A whole job. form: wav, rf64, flac or csv; sense: "against rotation" or "with rotation"."""
    draw = random.Random(seed)
    csv = form == "csv"
    rpm = draw.uniform(1100, 1500)
    radii = [draw.choice([200, 310, 455]) for _ in range(planes)]
    heavy = [{"plane": p, "mass_g": draw.uniform(30, 80), "radius_mm": radii[p], "body_deg": draw.uniform(0, 360)}
             for p in range(planes)]
    first, second = draw.uniform(34, 40), draw.uniform(44, 52)
    modes = [{"x_hz": first, "y_hz": first * 1.15, "damping": 0.05, "mass_kg": 300,
              "planes": [1.0, draw.uniform(0.8, 1.2)][:planes], "sensors": [1.0, 0.9]},
             {"x_hz": second, "y_hz": second * 1.1, "damping": 0.04, "mass_kg": 450,
              "planes": [1.0, -draw.uniform(0.8, 1.2)][:planes], "sensors": [0.9, -1.0]}]
    runs = [{"name": "as-found"}]
    fitted = []
    for p in range(planes):
        trial = {"plane": p, "mass_g": round(heavy[p]["mass_g"] * draw.uniform(0.6, 1.1), 1),
                 "angle_deg": draw.randrange(0, 360, 5)}
        if draw.random() < 0.3:
            trial["radius_mm"] = radii[p] * 0.9
        fitted = fitted + [trial] if left_on else [trial]
        runs.append({"name": f"trial {p + 1}", "file": f"trial-{p + 1}", "weights": fitted,
                     "rpm": rpm * draw.uniform(0.9985, 1.0015)})
    aim = ["repeatability = 0.5 %"] + ([f"mounted = trial {planes}"] if mounted else [])
    turning = turning or draw.choice(["clockwise", "counter-clockwise"])
    spec = {
        "seed": seed, "title": f"Invented job {seed}", "angles": sense,
        "rotor": {"turning": turning, "start_deg": draw.uniform(0, 360), "rpm": rpm,
                  "wander": [[0.003, 6.1, draw.uniform(0, 6)], [0.001, 2.3, draw.uniform(0, 6)]]},
        "tape": {"at_deg": draw.uniform(0, 360), "width_deg": draw.uniform(12, 25)},
        "tacho": {"at_deg": draw.uniform(0, 360), "low_v": 0.2, "high_v": draw.uniform(2, 6), "noise_v": 0.02},
        "modes": modes, "heavy": heavy,
        "sensors": [sensor(draw, "A-H", csv, 0), sensor(draw, "B-H", csv, draw.choice([0, 30]))],
        "planes": [{"name": f"disc {p + 1}", "radius_mm": radii[p],
                    "lines": ["positions = 24 from 0 deg", "pieces = 2"]} for p in range(planes)],
        "runs": runs,
        "recording": {"format": form, "bits": bits, "rate_hz": 4096, "seconds": 10, "full_scale_v": 10} | recording,
        "sheet": {"rotor": ["mass = 2500 kg", f"service speed = {rpm:.6g} rpm", f"rotation = {turning}",
                            "seen from = drive end"], "aim": aim}}
    if csv:
        dialect = dict(CSV_DIALECTS[seed % len(CSV_DIALECTS)])
        spec["recording"]["csv"] = dialect | {"tacho_digits": 3}
        spec["sheet"]["recording"] = [] if "time_name" in dialect else ["rate = 4096 Hz"]
    elif form != "csv":
        spec["sheet"]["recording"] = ["full scale = 10 V"]
    return spec
