"""Makes the tables of the ready plans. Everything in them is invented; the seeds make them repeatable.

Run from anywhere: ``python plans/invent.py`` writes each table beside its plan.
"""

from __future__ import annotations

import csv
import sys
from collections.abc import Mapping, Sequence
from pathlib import Path

import numpy as np

HERE = Path(__file__).parent
Cells = Sequence[object]


def write(folder: str, name: str, columns: Mapping[str, Cells]) -> None:
    """Write columns of equal length as a CSV file."""
    path = HERE / folder / name
    with path.open("w", newline="", encoding="utf-8") as stream:
        lines = csv.writer(stream, lineterminator="\n")
        lines.writerow(columns)
        lines.writerows(zip(*columns.values(), strict=True))


def shown(values: np.ndarray, decimals: int) -> list[str]:
    """Numbers as an instrument would print them; NaN as an empty cell."""
    return ["" if np.isnan(value) else f"{value:.{decimals}f}" for value in values]


def beside(rng: np.random.Generator, values: np.ndarray, r: float) -> np.ndarray:
    """A standardized column whose correlation with ``values`` is about ``r``."""
    z = (values - values.mean()) / values.std()
    return r * z + np.sqrt(1.0 - r * r) * rng.normal(size=len(values))


def cold_rooms() -> None:
    """Electricity of apple cold rooms: one table in which every kind of ruling occurs."""
    rng = np.random.default_rng(20260311)
    n = 420
    day = np.arange(n) // 10
    outdoor = 12 + 11 * np.sin(2 * np.pi * day / 42 - 1.2) + rng.normal(0, 4, n)
    load = np.clip(rng.normal(60, 14, n), 15, 110)
    pallets = np.rint(np.clip(62 + 15 * beside(rng, load, 0.90), 5, 130))
    openings = np.rint(rng.gamma(1.4, 26, n) + 1)
    fan = np.clip(14 + 3.2 * rng.normal(size=n), 4, 24)
    coil = np.clip(2.1 + 0.5 * beside(rng, fan, 0.86), 0.2, 4)
    lamp = np.clip(rng.normal(7, 2, n), 0, 16)
    staff = np.clip(6.5 + 1.8 * beside(rng, lamp, 0.93), 0, 16)
    starts = np.clip(np.rint(rng.normal(38, 7, n)), 10, 70)
    running = np.clip(9 + 1.5 * beside(rng, starts, 0.95), 2, 20)
    suction = np.clip(rng.normal(2.4, 0.25, n), 1.5, 3.4)
    glycol = -6 + 1.1 * beside(rng, suction, 0.84)
    age = np.rint(rng.uniform(1, 24, n))
    insulation = np.rint(rng.normal(14, 2.5, n))
    night = np.clip(rng.normal(0.42, 0.09, n), 0.1, 0.8)
    ceiling = np.round(rng.choice([4.5, 5.0, 5.5, 6.0, 7.0], n), 1)
    humidity = np.clip(rng.normal(90, 3.5, n), 75, 99)
    wind = np.clip(rng.gamma(2.0, 2.0, n), 0, 20)
    kind = rng.choice(["chilled", "frozen", "controlled air"], n, p=[0.5, 0.28, 0.22])
    kwh = (
        120
        + 4.6 * outdoor
        + 1.5 * load
        + 24 * np.sqrt(openings)
        + 13 * fan
        + 78 * coil
        + 1.05 * starts
        + 3.0 * running
        + 95 * suction
        - 9.5 * glycol
        + 0.8 * (age - 12.5) ** 2
        + 2.0 * age
        - 0.5 * insulation
        + 60 * night
        + 1.3 * humidity
        + 0.55 * outdoor * np.sqrt(openings)
        + np.where(kind == "frozen", 70, 0)
        + np.where(kind == "controlled air", 34, 0)
        + rng.normal(0, 40, n)
    )
    humidity[rng.choice(n, 29, replace=False)] = np.nan
    wind[rng.choice(n, 240, replace=False)] = np.nan
    glycol[[17, 203]] = np.nan
    kwh[[88, 301, 302]] = np.nan
    # A meter that was read in the wrong week in a room run at its limits.
    load[149], fan[149], suction[149] = 104.0, 23.5, 3.3
    kwh[149] += 640.0
    commissioned = np.where(np.arange(n) % 37 == 5, "no", "yes")
    write(
        "cold-rooms",
        "cold-rooms.csv",
        {
            "reading": [f"r{place:04d}" for place in range(1, n + 1)],
            "commissioned": commissioned.tolist(),
            "day": [f"2026-{3 + d // 31:02d}-{1 + d % 31:02d}" for d in day.tolist()],
            "kwh": shown(kwh, 1),
            "outdoor_temp": shown(outdoor, 1),
            "load": shown(load, 1),
            "pallets": shown(pallets, 0),
            "door_openings": shown(openings, 0),
            "fan_hours": shown(fan, 1),
            "coil_load": shown(coil, 2),
            "lamp_hours": shown(lamp, 1),
            "staff_hours": shown(staff, 1),
            "compressor_starts": shown(starts, 0),
            "compressor_hours": shown(running, 1),
            "suction_pressure": shown(suction, 2),
            "glycol_temp": shown(glycol, 1),
            "room_age": shown(age, 0),
            "insulation": shown(insulation, 0),
            "night_share": shown(night, 2),
            "ceiling_height": shown(ceiling, 1),
            "humidity": shown(humidity, 1),
            "wind": shown(wind, 1),
            "room_kind": kind.tolist(),
            "remark": ["" for _ in range(n)],
        },
    )


def reading_room() -> None:
    """Visits to a reading room: nothing that was thought of goes with them, and the mean is the answer."""
    rng = np.random.default_rng(4711)
    n = 96
    weekday = np.array(["Mon", "Tue", "Wed", "Thu"])[np.arange(n) % 4]
    write(
        "reading-room",
        "visits.csv",
        {
            "date": [f"2026-{1 + place // 16:02d}-{1 + (place % 16) * 1:02d}" for place in range(n)],
            "visits": shown(np.rint(rng.normal(214, 31, n)), 0),
            "temperature": shown(rng.normal(11, 7, n), 1),
            "rain": shown(rng.gamma(0.8, 4.0, n), 1),
            "new_titles": shown(np.rint(rng.gamma(4.0, 5.0, n)), 0),
            "posts": shown(rng.poisson(3.0, n).astype(float), 0),
            "weekday": weekday.tolist(),
        },
    )


def stream_clarity() -> None:
    """Clarity of a stream after rain: theory names the causes, and there are too few samplings."""
    rng = np.random.default_rng(338)
    n = 19
    rain = np.round(rng.gamma(2.0, 7.0, n), 1)
    bank = np.round(rng.uniform(5, 60, n), 0)
    cattle = rng.poisson(12, n).astype(float)
    turbidity = 14 + 0.22 * rain + 0.09 * bank + 0.20 * cattle + rng.normal(0, 7.5, n)
    write(
        "stream-clarity",
        "samplings.csv",
        {
            "sampling": [f"s{place:02d}" for place in range(1, n + 1)],
            "turbidity": shown(turbidity, 1),
            "rain_48h": shown(rain, 1),
            "bare_bank": shown(bank, 0),
            "cattle": shown(cattle, 0),
        },
    )


def repair_bench(name: str, seed: int, n: int, start: int, parts_effect: float) -> None:
    """Minutes at a bicycle repair bench; a second quarter in which one ruling falls otherwise."""
    rng = np.random.default_rng(seed)
    age = np.clip(rng.gamma(3.0, 3.0, n), 0.2, 40)
    parts = rng.poisson(2.2, n).astype(float)
    electric = rng.choice(["no", "yes"], n, p=[0.7, 0.3])
    queue = rng.poisson(5.0, n).astype(float)
    experience = np.round(rng.uniform(0.5, 20, n), 1)
    minutes = (
        18
        + 1.1 * age
        + parts_effect * parts
        + np.where(electric == "yes", 14, 0)
        - 0.7 * experience
        + rng.normal(0, 12, n)
    )
    write(
        "repair-bench",
        name,
        {
            "job": [f"j{place:04d}" for place in range(start, start + n)],
            "minutes": shown(np.clip(minutes, 3, None), 0),
            "bike_age": shown(age, 1),
            "parts": shown(parts, 0),
            "electric": electric.tolist(),
            "queue": shown(queue, 0),
            "experience": shown(experience, 1),
        },
    )


def main() -> int:
    """Write every table."""
    for folder in ("cold-rooms", "reading-room", "stream-clarity", "repair-bench"):
        (HERE / folder).mkdir(exist_ok=True)
    cold_rooms()
    reading_room()
    stream_clarity()
    repair_bench("jobs-q1.csv", 612, 180, 1, 0.6)
    repair_bench("jobs-q2.csv", 613, 210, 181, 2.2)
    return 0


if __name__ == "__main__":
    sys.exit(main())
