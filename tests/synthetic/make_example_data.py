#!/usr/bin/env python3
"""Invented readings of the example campaign, with known truth.

    python3 tests/synthetic/make_example_data.py            write the files
    python3 tests/synthetic/make_example_data.py --check    compare with the files, write nothing

Given: the rows S1-K17 of raw/day-1.csv; they are read, never changed. Made: the rows S2-K17 of that file, the raw files
of days 2 and 3, the lists in the blocks A2, W2 (day-2.md) and W6 (day-3.md), and truth.json.

Model of a reading, in mg:
    R = [ (m - 1 kg) - rho V(T) - m Gamma h ] / k + offset + drift + noise,   V(T) = V_20 [1 + beta (T - 20 degC)]
with rho from the CIPM-2007 equation (Metrologia 45 (2008) 149-155) at the true conditions, times the true error of the
equation. An instrument shows the true condition minus its true correction, plus noise.

The stream is Python's Mersenne Twister through random(), which is the same for every version; normal deviates come from
NormalDist().inv_cdf.
"""

import csv
import io
import json
import math
import random
import statistics
import sys
from datetime import datetime, timedelta, timezone
from pathlib import Path

HERE = Path(__file__).resolve().parent
CAMPAIGN = HERE.parent.parent / "example-records" / "campaigns" / "two-kilograms"

# What is true, in kg, m3, m, 1/K.
STANDARDS = {
    "K17": {"mass": 1.0000012825912, "volume_20": 1.2520361513709778e-4, "height": 0.0271, "expansion": 48.0e-6},
    "S1": {"mass": 0.9999991270278, "volume_20": 1.2559647305953277e-4, "height": 0.0269, "expansion": 48.0e-6},
    "S2": {"mass": 1.0000004820000, "volume_20": 1.2524041e-4, "height": 0.02722, "expansion": 48.3e-6},
}
NUISANCE = {
    "temperature_correction_K": 0.004401329784204814,
    "pressure_correction_Pa": 1.047472852598412,
    "humidity_correction_percent": -0.6156944631143368,
    "dew_point_correction_K": -0.041,
    "carbon_dioxide_mol_mol": {"1": 435e-6, "2": 419e-6, "3": 452e-6},
    "air_density_equation_relative_error": 4.239742659231338e-05,
    "gravity_gradient_over_g_per_m": 3.0071355759429153e-07,
    "mass_per_reading": 0.9999763,
}
READING_NOISE_MG = 0.00042
DRIFT_WALK_MG = 0.00045
BETWEEN_SERIES_MG = 0.00035
INTERVAL_S = 90
ZERO = {1: "2041-05-14T06:00:00Z", 2: "2041-05-15T06:00:00Z", 3: "2041-05-16T06:00:00Z"}

stream = random.Random(20410514)


def normal(standard_deviation):
    uniform = stream.random()
    return standard_deviation * statistics.NormalDist().inv_cdf(min(max(uniform, 1e-12), 1 - 1e-12))


def saturation_pressure(t):
    kelvin = t + 273.15
    return math.exp(1.2378847e-5 * kelvin**2 - 1.9121316e-2 * kelvin + 33.93711047 - 6.3431645e3 / kelvin)


def enhancement(p, t):
    return 1.00062 + 3.14e-8 * p + 5.6e-7 * t**2


def air_density(t, p, humidity, carbon_dioxide):
    """t in degC, p in Pa, humidity 0..1; kg/m3."""
    kelvin = t + 273.15
    x = humidity * enhancement(p, t) * saturation_pressure(t) / p
    z = (
        1
        - p / kelvin * (1.58123e-6 - 2.9331e-8 * t + 1.1043e-10 * t**2 + (5.707e-6 - 2.051e-8 * t) * x + (1.9898e-4 - 2.376e-6 * t) * x**2)
        + (p / kelvin) ** 2 * (1.83e-11 - 0.765e-8 * x**2)
    )
    dry = (28.96546 + 12.011 * (carbon_dioxide - 0.0004)) * 1e-3
    return p * dry / (z * 8.314472 * kelvin) * (1 - x * (1 - 18.01528e-3 / dry))


def dew_point(t, p, humidity):
    """The temperature at which f p_sv equals the partial pressure of the vapour; bisection."""
    partial = humidity * enhancement(p, t) * saturation_pressure(t)
    low, high = -20.0, t
    for _ in range(80):
        middle = (low + high) / 2
        low, high = (middle, high) if enhancement(p, middle) * saturation_pressure(middle) < partial else (low, middle)
    return (low + high) / 2


def interpolate(points, at):
    """Linear between points, linear beyond them along the chord of the last two hours."""
    if at >= points[-1][0]:
        first = next(point for point in points if point[0] >= points[-1][0] - 2400)
        (t0, y0), (t1, y1) = first, points[-1]
    else:
        index = next(i for i in range(1, len(points)) if points[i][0] >= at)
        (t0, y0), (t1, y1) = points[index - 1], points[index]
    return y0 + (y1 - y0) * (at - t0) / (t1 - t0)


class Day:
    """True conditions of a day against seconds since its zero time."""

    def __init__(self, number, temperature, pressure, humidity):
        self.number, self.temperature, self.pressure, self.humidity = number, temperature, pressure, humidity

    def density(self, at):
        equation = air_density(self.temperature(at), self.pressure(at), self.humidity(at) / 100, NUISANCE["carbon_dioxide_mol_mol"][str(self.number)])
        return equation * (1 + NUISANCE["air_density_equation_relative_error"])

    def shown(self, at):
        """Temperature, pressure, humidity as the instruments show them."""
        return (
            self.temperature(at) - NUISANCE["temperature_correction_K"] + normal(0.0006),
            self.pressure(at) - NUISANCE["pressure_correction_Pa"] + normal(0.4),
            self.humidity(at) - NUISANCE["humidity_correction_percent"] + normal(0.05),
        )

    def dew_point_shown(self, at):
        true = dew_point(self.temperature(at), self.pressure(at), self.humidity(at) / 100)
        return true - NUISANCE["dew_point_correction_K"] + normal(0.01)


class Comparator:
    """Offset and drift go on through the whole campaign."""

    def __init__(self, offset, trend):
        self.offset, self.trend = offset, trend

    def reading(self, day, name, at, disturbance=0.0):
        standard = STANDARDS[name]
        volume = standard["volume_20"] * (1 + standard["expansion"] * (day.temperature(at) - 20))
        gravity = standard["mass"] * NUISANCE["gravity_gradient_over_g_per_m"] * standard["height"]
        load = (standard["mass"] - 1) * 1e6 - day.density(at) * volume * 1e6 - gravity * 1e6
        self.offset += self.trend + normal(DRIFT_WALK_MG)
        return load / NUISANCE["mass_per_reading"] + self.offset + disturbance + normal(READING_NOISE_MG)

    def series(self, day, item, start, cycles, disturbed=None):
        """Rows (cycle, which, time, reading) of one ABBA series; `disturbed` is (cycle, place in the cycle, mg)."""
        self.offset = normal(1.5)
        between = normal(BETWEEN_SERIES_MG)
        rows = []
        for index in range(4 * cycles):
            cycle, place, at = index // 4 + 1, index % 4, start + index * INTERVAL_S
            second = place in (1, 2)
            extra = between if second else 0.0
            if disturbed and disturbed[:2] == (cycle, place):
                extra += disturbed[2]
            rows.append((cycle, "B" if second else "A", at, self.reading(day, item if second else "K17", at, extra)))
        return rows


def clock(day, seconds):
    zero = datetime.fromisoformat(ZERO[day].replace("Z", "+00:00"))
    return (zero + timedelta(seconds=seconds)).astimezone(timezone.utc).strftime("%Y-%m-%dT%H:%M:%SZ")


def hours(text):
    hour, minute = text.split(":")
    return (int(hour) - 6) * 3600 + int(minute) * 60


def table(rows):
    out = io.StringIO()
    csv.writer(out, lineterminator="\n").writerows(rows)
    return out.getvalue()


def day_1():
    """The given rows of S1 and the made rows of S2, in order of time."""
    path = CAMPAIGN / "raw" / "day-1.csv"
    lines = list(csv.reader(path.read_text().splitlines()))
    head, given = lines[0], [line for line in lines[1:] if line[0] == "S1-K17"]
    columns = [[(float(line[4]), float(line[i])) for line in given] for i in (6, 7, 8)]
    truth = [NUISANCE["temperature_correction_K"], NUISANCE["pressure_correction_Pa"], NUISANCE["humidity_correction_percent"]]
    smooth = [[(sum(t for t, _ in c[i : i + 10]) / 10, sum(y for _, y in c[i : i + 10]) / 10) for i in range(0, len(c), 10)] for c in columns]
    day = Day(1, *[(lambda at, p=points, c=correction: interpolate(p, at) + c) for points, correction in zip(smooth, truth)])
    comparator, made = Comparator(0.0, 0.00006), []
    for number, start in enumerate((6030, 14070, 22110, 30150), 1):
        for cycle, which, at, reading in comparator.series(day, "S2", start, 5):
            t, p, h = day.shown(at)
            made.append(["S2-K17", str(number), str(cycle), which, f"{at:.1f}", f"{reading:.5f}", f"{t:.4f}", f"{p:.2f}", f"{h:.3f}"])
    rows = sorted(given + made, key=lambda line: float(line[4]))
    return {path: table([head] + rows)}


def indication_lines(series):
    lines = []
    for day, start, rows in series:
        lines += [f"  - start: {clock(day, start)}", f"    interval: {INTERVAL_S} s", "    indications:"]
        for first in range(0, len(rows), 4):
            lines.append("      - [" + ", ".join(f"{row[3]:.5f}" for row in rows[first : first + 4]) + "]")
    return lines


def fill(text, block, key, lines):
    """Replaces what stands under `key:`, the last field of `block`."""
    head, rest = text.split(f"```yaml {block}\n", 1)
    body, tail = rest.split("```", 1)
    kept = body.split(f"\n{key}:", 1)[0] if f"\n{key}:" in body else body.rstrip("\n")
    return f"{head}```yaml {block}\n{kept}\n{key}:\n" + "\n".join(lines) + f"\n```{tail}"


def day_2():
    day = Day(
        2,
        lambda at: 20.312 + 0.014 * math.sin(at / 5200) - 4e-7 * at,
        lambda at: 97164.0 + 0.0041 * at + 9.0 * math.sin(at / 3300),
        lambda at: 46.4 + 0.9 * math.sin(at / 7000 + 1),
    )
    comparator = Comparator(0.0, -0.00004)
    first, second = [], []
    for a, b in (("07:10", "08:10"), ("09:20", "10:20"), ("11:30", "12:30")):
        first.append((2, hours(a), comparator.series(day, "S1", hours(a), 5)))
        disturbed = (3, 1, 0.0353) if b == "10:20" else None
        second.append(comparator.series(day, "S2", hours(b), 5, disturbed))
    readings = []
    for minutes in range(50, 441, 10):
        t, p, h = day.shown(minutes * 60)
        readings.append(f"  - {{time: {clock(2, minutes * 60)}, temperature: {t:.4f} °C, pressure: {p / 100:.4f} hPa, humidity: {h:.3f} %}}")
    rows = [["series", "cycle", "which", "t_s", "reading_mg"]]
    for number, series in enumerate(second, 1):
        rows += [[number, cycle, which, f"{at:.1f}", f"{reading:.5f}"] for cycle, which, at, reading in series]
    record = CAMPAIGN / "day-2.md"
    text = fill(record.read_text(), "ambient A2", "readings", readings)
    text = fill(text, "comparison W2", "series", indication_lines(first))
    return {CAMPAIGN / "raw" / "day-2.csv": table(rows), record: text}


def day_3():
    day = Day(
        3,
        lambda at: 20.287 + 0.011 * math.sin(at / 6100 + 2) + 5e-7 * at,
        lambda at: 96248.0 - 0.0023 * at + 14.0 * math.sin(at / 4100 + 1),
        lambda at: 44.1 + 1.1 * math.sin(at / 8000),
    )
    comparator = Comparator(0.0, 0.00002)
    rows = [["series", "cycle", "which", "time", "reading_mg"]]
    for number, start in enumerate(("07:05", "09:05", "11:05", "13:05"), 1):
        for cycle, which, at, reading in comparator.series(day, "S1", hours(start), 5):
            rows.append([number, cycle, which, clock(3, at), f"{reading:.5f}"])
    second = [(3, hours(start), comparator.series(day, "S2", hours(start), 4)) for start in ("08:10", "10:10", "12:10")]
    log = [["time", "T_degC", "p_Pa", "dew_point_degC"]]
    for minutes in range(50, 481, 10):
        t, p, _ = day.shown(minutes * 60)
        log.append([clock(3, minutes * 60), f"{t:.4f}", f"{p:.2f}", f"{day.dew_point_shown(minutes * 60):.3f}"])
    record = CAMPAIGN / "day-3.md"
    return {
        CAMPAIGN / "raw" / "day-3.csv": table(rows),
        CAMPAIGN / "raw" / "day-3-conditions.csv": table(log),
        record: fill(record.read_text(), "comparison W6", "series", indication_lines(second)),
    }


def truth():
    def conventional(standard):
        return standard["mass"] * (1 - 1.2 * standard["volume_20"] / standard["mass"]) / (1 - 1.2 / 8000)

    k17 = STANDARDS["K17"]
    content = {
        "note": "True values behind the example campaign: mass in air in kg, volume at 20 degC in m3, heights in m, expansion in 1/K",
        "standards": {name: standard | {"conventional_mass": conventional(standard)} for name, standard in STANDARDS.items()},
        "differences_kg": {f"{name} minus K17": STANDARDS[name]["mass"] - k17["mass"] for name in ("S1", "S2")},
        "nuisance": NUISANCE,
        "disturbed": {"comparison": "W5", "series": 2, "cycle": 3, "weighing": 2, "mg": 0.0353},
    }
    return {HERE / "truth.json": json.dumps(content, indent=1) + "\n"}


def main():
    files = day_1() | day_2() | day_3() | truth()
    wrong = [path for path, text in files.items() if not path.exists() or path.read_text() != text]
    if "--check" in sys.argv:
        print("\n".join(f"differs: {path}" for path in wrong) or "all files agree")
        return 1 if wrong else 0
    for path, text in files.items():
        path.write_text(text)
        print(f"{'written' if path in wrong else 'unchanged'}: {path.relative_to(HERE.parent.parent)}")
    return 0


if __name__ == "__main__":
    sys.exit(main())
