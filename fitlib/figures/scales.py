"""From values to positions: limits, powers of ten and ticks, so that the drawing library sees sane numbers only."""

from __future__ import annotations

import math
from dataclasses import dataclass

import numpy as np
from matplotlib.ticker import MaxNLocator

from fitlib.figures.words import axis_label, power_of_ten

BEYOND = 40.0  # a clipped curve is led this many panel heights away, so that it leaves the panel at its own slope


@dataclass(frozen=True)
class LinearScale:
    """Positions are (value - offset) / 10**power; `lower` and `upper` are positions."""

    lower: float
    upper: float
    power: int = 0
    offset: float = 0.0

    def __call__(self, values: object) -> np.ndarray:
        """Positions of values, led no farther than `BEYOND` panels off the panel."""
        with np.errstate(over="ignore", invalid="ignore"):
            at = (np.asarray(values, dtype=float) - self.offset) / 10.0**self.power
        reach = BEYOND * (self.upper - self.lower)
        return np.clip(at, self.lower - reach, self.upper + reach)

    def inside(self, values: object) -> np.ndarray:
        """True where a value lies within the panel."""
        at = self(values)
        return (at >= self.lower) & (at <= self.upper)

    def label(self, quantity: str, unit: str) -> str:
        """The axis label that belongs to this scale."""
        return axis_label(quantity, unit, self.power, self.offset)

    def ticks(self, count: int) -> tuple[list[float], list[str]]:
        """Tick positions and their texts."""
        found = MaxNLocator(count, steps=[1, 2, 2.5, 5, 10]).tick_values(self.lower, self.upper)
        slack = 1e-9 * (self.upper - self.lower)
        at = [float(tick) for tick in found if self.lower - slack <= tick <= self.upper + slack]
        return at, _tick_texts(at)


def _tick_texts(at: list[float]) -> list[str]:
    """Ticks with as many decimals as their step needs."""
    step = min(np.diff(at)) if len(at) > 1 else max(abs(at[0]), 1.0) if at else 1.0
    decimals = max(0, -math.floor(math.log10(step) + 1e-9))
    decimals += 0 if math.isclose(step, round(step, decimals), rel_tol=1e-6) else 1
    return [f"{tick + 0.0:.{decimals}f}".replace("-", "−") for tick in at]


def finite(*arrays: object) -> np.ndarray:
    """All finite values of several arrays, as one."""
    parts = [np.asarray(array, dtype=float).ravel() for array in arrays]
    joined = np.concatenate(parts) if parts else np.empty(0)
    return joined[np.isfinite(joined)]


def linear_scale(values: object, margin: float = 0.05) -> LinearScale:
    """A scale that shows all finite values with a margin (share of their range)."""
    values = finite(values)
    if not values.size:
        return LinearScale(-1.0, 1.0)
    low, high = float(values.min()), float(values.max())
    offset = _offset(low, high)
    size = max(abs(low - offset), abs(high - offset))
    power = _power(size)
    low, high, size = (low - offset) / 10.0**power, (high - offset) / 10.0**power, size / 10.0**power
    if high - low <= 1e-12 * size:
        low, high = (low - 0.05 * size, high + 0.05 * size) if size else (-1.0, 1.0)
    pad = margin * (high - low)
    return LinearScale(low - pad, high + pad, power, offset)


def _power(size: float) -> int:
    """The power of ten taken out of the numbers: none between 0.01 and 100 000, else a multiple of three."""
    if size == 0 or 1e-2 <= size < 1e5:
        return 0
    return max(-300, 3 * math.floor(math.log10(size) / 3))


def _offset(low: float, high: float) -> float:
    """A round number taken off where the range is tiny against the values, else nothing."""
    span = high - low
    if not 1e-12 * abs(high) < span < 1e-4 * max(abs(low), abs(high)):
        return 0.0
    return float(f"{low:.{max(1, math.ceil(math.log10(abs(low) / span)))}g}")


@dataclass(frozen=True)
class DecadeScale:
    """Positions are decimal logarithms; what has none (zero) is put at `lower` and told in a note."""

    lower: float
    upper: float
    labelled: bool = True

    def __call__(self, values: object) -> np.ndarray:
        """Positions of values; nan stays nan."""
        values = np.asarray(values, dtype=float)
        at = np.full(values.shape, np.nan)
        positive = values > 0
        at[positive] = np.log10(values[positive])
        at[values <= 0] = self.lower
        return np.clip(at, self.lower, self.upper + BEYOND * (self.upper - self.lower))

    def ticks(self) -> tuple[list[float], list[str], list[float]]:
        """Major tick positions, their texts, and minor tick positions."""
        if not self.labelled:
            return [], [], []
        decades = range(math.floor(self.lower), math.ceil(self.upper) + 1)
        stride = max(1, math.ceil(len(decades) / 8))
        span = self.upper - self.lower
        marks = (1.0,) if span > 2.5 else (1.0, 2.0, 5.0) if span > 1 else (1.0, 1.5, 2.0, 3.0, 4.0, 5.0, 7.0)
        major = [(d + math.log10(m), _decade_text(m, d)) for d in decades if d % stride == 0 for m in marks]
        major = [pair for pair in major if self.lower <= pair[0] <= self.upper]
        minor = [d + math.log10(m) for d in decades for m in range(2, 10)] if stride == 1 else []
        return [at for at, _ in major], [text for _, text in major], minor


def _decade_text(mark: float, decade: int) -> str:
    """For example ``0.002``, ``500`` or ``2 × 10⁻⁷``."""
    if -4 <= decade <= 4:
        return f"{mark * 10.0**decade:.{max(0, (mark == 1.5) - decade)}f}"
    return power_of_ten(decade) if mark == 1.0 else f"{mark:g} × {power_of_ten(decade)}"


def decade_scale(values: object) -> DecadeScale:
    """A logarithmic scale that shows all positive values and at least one labelled step."""
    values = finite(values)
    positive = np.log10(values[values > 0])
    if not positive.size:
        return DecadeScale(-1.0, 1.0, labelled=False)
    low, high = float(positive.min()), float(positive.max())
    pad = max(0.06 * (high - low), (0.8 - (high - low)) / 2)
    below = 0.5 if np.any(values <= 0) else 0.0
    return DecadeScale(low - pad - below, high + pad)


def set_linear(axis: object, scale: LinearScale, quantity: str, unit: str, ticks: int = 6) -> None:
    """Give an axis of a panel its limits, ticks and label."""
    at, texts = scale.ticks(ticks)
    axis.set_ticks(at, labels=texts)
    axis.set_view_interval(scale.lower, scale.upper, ignore=True)
    axis.set_label_text(scale.label(quantity, unit))


def set_decades(axis: object, scale: DecadeScale, label: str) -> None:
    """Give an axis of a panel a logarithmic scale."""
    at, texts, minor = scale.ticks()
    axis.set_ticks(at, labels=texts)
    axis.set_ticks([tick for tick in minor if scale.lower <= tick <= scale.upper], minor=True)
    axis.set_view_interval(scale.lower, scale.upper, ignore=True)
    axis.set_label_text(label)
