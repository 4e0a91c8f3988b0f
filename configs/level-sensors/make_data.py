"""Write the invented observations of this study: ``python make_data.py [FOLDER]``.

Rerunning it gives the same bytes: every sensor has a random stream of its own, currents are rounded to the resolution
of the indication (0.001 mA) and water levels to that of the dip gauge (0.001 m).
"""

from __future__ import annotations

import sys
from collections.abc import Callable
from dataclasses import dataclass
from pathlib import Path

import numpy as np

FULL_SCALE = 10.0  # m of water
LEVELS = np.linspace(0.0, FULL_SCALE, 11)
HALF_METRES = np.linspace(0.0, FULL_SCALE, 21)
BETWEEN_LEVELS = np.array([0.5, 2.5, 4.5, 6.5, 8.5, 9.5])
REPEATABILITY = 0.004  # mA, standard deviation of one reading
RUN_SHIFT = 0.001  # mA, standard deviation of what all readings of one run share


@dataclass(frozen=True)
class Sensor:
    """One sensor: the shape that its readings scatter around, and how it was read."""

    seed: int
    shape: Callable[[np.ndarray], np.ndarray]
    levels: np.ndarray
    runs: tuple[int, ...] = (1, 2, 3)
    readings: int = 1
    level_deviation: float = 0.0  # mA, standard deviation of what all readings at one level share
    setting_scatter: float = 0.0  # m, half width of the interval in which a level between the ends is set
    hysteresis: float = 0.0  # mA, falling less rising at half scale; asked for: even runs are falling


def straight(zero: float, gain: float) -> Callable[[np.ndarray], np.ndarray]:
    return lambda level: zero + gain * level


def bowed(zero: float, gain: float, height: float) -> Callable[[np.ndarray], np.ndarray]:
    """A line with a quadratic bow; ``height`` in mA at half scale."""
    return lambda level: zero + gain * level + 4 * height * (level / FULL_SCALE) * (1 - level / FULL_SCALE)


def saturating(zero: float, gain: float, loss: float) -> Callable[[np.ndarray], np.ndarray]:
    """A line that loses ``loss`` mA at full scale, growing with the cube of the level."""
    return lambda level: zero + gain * level - loss * (level / FULL_SCALE) ** 3


def stepped(zero: float, gain: float, half_step: float, place: float, width: float):
    """A line with one smooth step of twice ``half_step`` mA."""
    return lambda level: zero + gain * level + half_step * np.tanh((level - place) / width)


SENSORS = {
    "LS-101": Sensor(110, straight(4.012, 1.5985), LEVELS),
    "LS-102": Sensor(102, bowed(3.995, 1.6003, 0.048), LEVELS, readings=2),
    "LS-103": Sensor(103, saturating(4.004, 1.6020, 1.2), LEVELS, readings=2),
    "LS-104": Sensor(104, straight(3.989, 1.6012), LEVELS, readings=2),
    "LS-105": Sensor(105, bowed(4.007, 1.5991, -0.040), LEVELS, runs=(1, 2, 3, 4), hysteresis=0.004),
    "LS-106": Sensor(106, stepped(4.060, 1.5900, 0.100, 6.2, 0.35), HALF_METRES, readings=2),
    "LS-107": Sensor(107, bowed(4.001, 1.6008, 0.052), LEVELS, setting_scatter=0.015),
    "LS-108": Sensor(109, straight(4.003, 1.5996), LEVELS, readings=3, level_deviation=3 * REPEATABILITY),
}
VERIFICATION = Sensor(1110, SENSORS["LS-101"].shape, BETWEEN_LEVELS, runs=(4,))

BAD_READING = {"run": 2, "level": 7.0, "reading": 1, "shift": 0.060}  # LS-104, mA: nobody knows why
MOVED_CABLE = {"run": 3, "level": 7.0, "shift": -0.210}  # LS-105, mA: noted in the log and excluded in the study


def set_level(sensor: Sensor, index: int, random: np.random.RandomState) -> float:
    """The level as the dip gauge reads it; the empty and the overflowing column are always the same."""
    if index in (0, sensor.levels.size - 1):
        return sensor.levels[index]
    return np.round(sensor.levels[index] + sensor.setting_scatter * random.uniform(-1, 1), 3)


def read_sensor(sensor: Sensor) -> list[dict]:
    """Observations of all runs in the order in which they were made; one dict per row."""
    # RandomState: numpy promises that this stream never changes, which it does not for the newer Generator.
    random = np.random.RandomState(sensor.seed)
    deviation = sensor.level_deviation * random.standard_normal(sensor.levels.size)
    rows = []
    for run in sensor.runs:
        shift = RUN_SHIFT * random.standard_normal()
        falling = bool(sensor.hysteresis) and run % 2 == 0
        for index in range(sensor.levels.size)[:: -1 if falling else 1]:
            level = set_level(sensor, index, random)
            share = level / FULL_SCALE
            hysteresis = 4 * sensor.hysteresis * share * (1 - share) * (0.5 if falling else -0.5)
            for reading in range(1, sensor.readings + 1):
                noise = REPEATABILITY * random.standard_normal()
                current = sensor.shape(level) + deviation[index] + shift + hysteresis + noise
                way = "falling" if falling else "rising"
                rows.append({"run": run, "way": way, "reading": reading, "level": level, "current": current})
    return rows


def disturb(rows: list[dict], where: dict) -> None:
    """Shift the one row that ``where`` names."""
    keys = [key for key in where if key != "shift"]
    (row,) = [row for row in rows if all(row[key] == where[key] for key in keys)]
    row["current"] += where["shift"]


def as_text(rows: list[dict], columns: dict[str, str], delimiter: str = ",", decimal: str = ".") -> str:
    """The rows as a table; ``columns`` gives the name in the header for each key that is written."""
    lines = [delimiter.join(columns.values())]
    for row in rows:
        cells = [f"{row[key]:.3f}" if key in ("level", "current") else str(row[key]) for key in columns]
        lines.append(delimiter.join(cell.replace(".", decimal) for cell in cells))
    return "\n".join(lines) + "\n"


def make_files() -> dict[str, str]:
    """The text of every data file by its name."""
    rows = {name: read_sensor(sensor) for name, sensor in SENSORS.items()}
    disturb(rows["LS-104"], BAD_READING)
    disturb(rows["LS-105"], MOVED_CABLE)
    plain = {"run": "run", "reading": "reading", "level": "water_level_m", "current": "current_mA"}
    both_ways = {"run": "run", "way": "way", "level": "water_level_m", "current": "current_mA"}
    files = {f"{name}.csv": as_text(table, plain) for name, table in rows.items() if name != "LS-105"}
    files["LS-105.csv"] = as_text(rows["LS-105"], both_ways, delimiter=";", decimal=",")
    files["LS-101-verification.csv"] = as_text(read_sensor(VERIFICATION), plain)
    return files


def main(folder: Path) -> None:
    folder.mkdir(parents=True, exist_ok=True)
    for name, text in make_files().items():
        (folder / name).write_text(text, encoding="utf-8", newline="\n")


if __name__ == "__main__":
    main(Path(sys.argv[1]) if len(sys.argv) > 1 else Path(__file__).parent / "data")
