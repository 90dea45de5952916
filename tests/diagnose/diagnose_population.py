"""Boards with one fault each, by formulas of their own.

Nothing of the package is used here: the node's equations, the faults and their sizes are written
out, so that the engine can be held against them. Timer astables, node C to
0 V; size of a fault: the larger of |change of ln t_high| and |change of ln t_low|, log-uniform from
5 to 40 %; healthy scatter normal: R 0.6 %, C 3 %, and that of the IC.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

Array = NDArray[np.float64]
Figures = dict[str, Array | float]

FAULTS = (
    "C-low",
    "C-high",
    "C-leaky",
    "RA-low",
    "RA-high",
    "RB-low",
    "RB-high",
    "discharge-weak",
    "discharge-leak",
    "control-low",
    "control-high",
    "upper-threshold",
    "lower-threshold",
    "node-leak-to-supply",
)
SIGNS = {"upper-threshold": (-1, 1), "lower-threshold": (-1, 1)}
STEMS = np.array([name.removesuffix("-low").removesuffix("-high") for name in FAULTS])
LOW, HIGH = 0.05, 0.40
LEAST_RA = 1e3

SETS = {
    "output": "O",
    "power-up": "OP",
    "control pin": "OK",
    "node": "ON",
    "control pin + shunt": "OKS",
    "+ power-up": "OKSP",
    "+ ohmmeter": "OKSPR",
}
"""What is seen: Output, Power-up, Control pin (K), Node, Shunt, RB by ohmmeter (R)."""

AXES = ("RA", "RB", "C", "thresholds", "split", "bias", "saturation", "on-resistance", "shunt")


@dataclass(frozen=True)
class Board:
    """A healthy board: ohms, farads, volts, amperes, seconds; spreads as in the notes."""

    name: str
    ra: float
    rb: float
    c: float
    v: float
    shunt: float
    family: str = "cmos"

    @property
    def is_bipolar(self) -> bool:
        """Whether it has the bipolar IC."""
        return self.family == "bipolar"

    @property
    def r_on(self) -> float:
        """14 ohm at 5 V and 7.7 ohm at 15 V for CMOS, a power law through both."""
        return 9.5 if self.is_bipolar else 14.0 * (self.v / 5) ** -0.5442

    def spreads(self) -> Array:
        """Standard uncertainties along ``AXES``."""
        u_threshold, u_split = (0.0055, 0.022) if self.is_bipolar else (0.006, 0.004)
        bias, saturation = (15e-9 / 3**0.5, 0.0185) if self.is_bipolar else (0.0, 0.0)
        own = (0.006, 0.006, 0.03, u_threshold, u_split, bias, saturation, 0.3 * self.r_on, 0.01)
        return np.array(own)


BOARDS = (
    Board("100k 330k 47u 12 V cmos", 100e3, 330e3, 47e-6, 12.0, 2.2e6),
    Board("10k 10k 100n 5 V cmos", 10e3, 10e3, 100e-9, 5.0, 100e3),
    Board("47k 22k 1u 12 V bipolar", 47e3, 22e3, 1e-6, 12.0, 330e3, "bipolar"),
    Board("4.7k 470k 10n 9 V cmos", 4.7e3, 470e3, 10e-9, 9.0, 2.2e6),
)


def healthy(board: Board, z: Array) -> Figures:
    """Return the figures of healthy boards at deviations along ``AXES``, shape (9, ...)."""
    upper = board.v * 2 / 3 * np.exp(z[3])
    bipolar = board.is_bipolar
    return {
        "v": board.v,
        "ra": board.ra * np.exp(z[0]),
        "rb": board.rb * np.exp(z[1]),
        "c": board.c * np.exp(z[2]),
        "upper": upper,
        "lower": upper / 2 * np.exp(z[4]),
        "pin": upper,
        "bias": (15e-9 if bipolar else 0.0) + z[5],
        "saturation": (0.037 if bipolar else 0.0) + z[6],
        "r_on": board.r_on + z[7],
        "switch_leak": 20e-9 if bipolar else 0.1e-9,
        "delay": 0.16e-6 if bipolar else 0.14e-6,
        "to_ground": 0.0,
        "to_supply": 0.0,
        "shunt": np.exp(-z[8]) / board.shunt,
    }


_SCALED = {
    "C-low": ("c",),
    "C-high": ("c",),
    "RA-low": ("ra",),
    "RA-high": ("ra",),
    "RB-low": ("rb",),
    "RB-high": ("rb",),
    "control-low": ("upper", "lower", "pin"),
    "control-high": ("upper", "lower", "pin"),
    "upper-threshold": ("upper",),
    "lower-threshold": ("lower",),
}
_ADDED = {
    "C-leaky": "to_ground",
    "node-leak-to-supply": "to_supply",
    "discharge-weak": "r_on",
    "discharge-leak": "switch_leak",
}


def hurt(fault: str, figures: Figures, x: Array) -> Figures:
    """Return figures scaled by e^x, or with e^x added, as the fault does."""
    if fault in _SCALED:
        return {**figures, **{key: figures[key] * np.exp(x) for key in _SCALED[fault]}}
    key = _ADDED[fault]
    return {**figures, key: figures[key] + np.exp(x)}


def slopes(f: Figures, shunt: Array | float = 0.0) -> tuple[Array, Array, Array, Array]:
    """Return end voltage and time constant of the rise, then of the fall."""
    rise = f["ra"] + f["rb"]
    loads = f["to_ground"] + f["to_supply"] + shunt
    source = f["v"] - f["switch_leak"] * f["ra"]
    inward = f["v"] * f["to_supply"] - f["bias"]
    g_rise = 1 / rise + loads
    floor = (f["v"] * f["r_on"] + f["saturation"] * f["ra"]) / (f["ra"] + f["r_on"])
    fall = f["rb"] + f["ra"] * f["r_on"] / (f["ra"] + f["r_on"])
    g_fall = 1 / fall + loads
    return (
        (source / rise + inward) / g_rise,
        f["c"] / g_rise,
        (floor / fall + inward) / g_fall,
        f["c"] / g_fall,
    )


def times(f: Figures, shunt: Array | float = 0.0) -> tuple[Array, Array, Array]:
    """Return high time, low time and first high; NaN where there is none."""
    top, tau_rise, bottom, tau_fall = slopes(f, shunt)
    with np.errstate(all="ignore"):
        over = top - (top - f["upper"]) * np.exp(-f["delay"] / tau_rise)
        under = bottom + (f["lower"] - bottom) * np.exp(-f["delay"] / tau_fall)
        high = f["delay"] + tau_rise * np.log((top - under) / (top - f["upper"]))
        low = f["delay"] + tau_fall * np.log((over - bottom) / (f["lower"] - bottom))
        first = f["delay"] + tau_rise * np.log(top / (top - f["upper"]))
    return high, low, first


def at_second_supply(board: Board, f: Figures) -> Figures:
    """Return the same boards at two thirds of their supply."""
    share = 2 / 3
    grown = 0.0 if board.is_bipolar else board.r_on * (share**-0.5442 - 1)
    moved = {key: f[key] * share for key in ("v", "upper", "lower", "pin")}
    return {**f, **moved, "r_on": f["r_on"] + grown}


def observe(board: Board, f: Figures, letters: str) -> tuple[Array, Array]:
    """Return what is seen, shape (m, ...), and the u of each, shape (m,)."""
    high, low, first = times(f)
    top, tau_rise, bottom, tau_fall = slopes(f)
    with np.errstate(all="ignore"):
        shunted, supplied = times(f, f["shunt"]), times(at_second_supply(board, f))
        node = [np.log(f["upper"]), np.log(f["lower"]), np.log(top), bottom / f["v"]]
        seen = {
            "O": [(np.log(high), 5e-4), (np.log(low), 5e-4)],
            "P": [(np.log(first), 1e-3)],
            "K": [(np.log(f["pin"]), 3e-3)],
            "N": [
                *((row, 5e-3) for row in node),
                *((np.log(tau), 3e-3) for tau in (tau_rise, tau_fall)),
            ],
            "S": [(np.log(time), 5e-4) for time in shunted[:2]],
            "V": [(np.log(time), 5e-4) for time in supplied[:2]],
            "R": [(np.log(f["rb"]), 5e-3)],
        }
    rows = [pair for letter in letters for pair in seen[letter]]
    shape = np.broadcast_shapes(*(np.shape(value) for value in f.values()))
    return np.stack([np.broadcast_to(row, shape) for row, _ in rows]), np.array(
        [u for _, u in rows]
    )


def measure(board: Board, f: Figures, letters: str, rng: np.random.Generator) -> Array:
    """Return what is seen with errors of measurement, shape (m, boards)."""
    seen, u = observe(board, f, letters)
    return seen + rng.standard_normal(seen.shape) * u[:, None]


def _natural(board: Board, fault: str, sign: int) -> Array:
    """Return x of ``hurt`` from no effect to the largest there can be."""
    if fault in ("C-leaky", "node-leak-to-supply"):
        return np.linspace(-12, 7, 8000) - np.log(board.ra + board.rb)
    if fault == "discharge-weak":
        return np.linspace(-12, 5, 8000) + np.log(board.rb)
    if fault == "discharge-leak":
        return np.linspace(-14, 0, 8000) + np.log(board.v / board.ra)
    largest = {
        "RA-low": np.log(board.ra / LEAST_RA),
        "control-low": 3.0,
        "control-high": np.log(1.4999),
        "upper-threshold": np.log(1.4999 if sign > 0 else 1.9999),
        "lower-threshold": np.log(1.9999) if sign > 0 else 6.0,
        "RA-high": 8.0,
    }.get(fault, 6.0)
    falls = fault.endswith("-low") or sign < 0
    return (-1 if falls else 1) * np.geomspace(1e-5, largest, 8000)


def curve(board: Board, fault: str, sign: int = 0) -> tuple[Array, Array]:
    """Return effects and x where the effect grows."""
    x = _natural(board, fault, sign)
    before = times(healthy(board, np.zeros((9, 1))))
    after = times(hurt(fault, healthy(board, np.zeros((9, 1))), x))
    with np.errstate(all="ignore"):
        effect = np.max(
            [abs(np.log(b / a)) for a, b in zip(before[:2], after[:2], strict=True)], axis=0
        )
    lost = ~np.isfinite(effect)
    stop = int(np.argmax(lost)) if lost.any() else effect.size
    effect, x = effect[:stop], x[:stop]
    grows = effect >= np.maximum.accumulate(effect)
    return effect[grows], x[grows]


def top_effect(board: Board, fault: str, sign: int = 0) -> float:
    """Return the largest effect of the population, LOW or less where there is none."""
    return min(HIGH, float(curve(board, fault, sign)[0][-1]))


def sizes_for(board: Board, fault: str, sign: int, effects: Array) -> Array:
    """Return x that has these effects."""
    effect, x = curve(board, fault, sign)
    return np.interp(np.log(effects), np.log(effect), x)


def possible(board: Board) -> list[int]:
    """Return the faults that reach an effect of ``LOW`` on a board."""
    return [k for k, name in enumerate(FAULTS) if top_effect(board, name) > LOW]


def draw(
    board: Board,
    n: int,
    rng: np.random.Generator,
    *,
    factors: Array | None = None,
    two: bool = False,
) -> tuple[NDArray[np.int64], Figures]:
    """Draw boards with a fault, or with two that are not opposites.

    Args:
        board: The healthy one.
        n: How many.
        rng: Random generator.
        factors: Factors on the spreads along ``AXES``.
        two: Whether there are two faults.

    Returns:
        Index of the (first) fault of each, and the figures.
    """
    scale = board.spreads() * (1.0 if factors is None else factors)
    figures = healthy(board, rng.standard_normal((9, n)) * scale[:, None])
    label, x = _draw_fault(board, n, rng)
    figures = _hurt_each(figures, label, x)
    if two:
        other, y = _draw_fault(board, n, rng)
        while (alike := STEMS[other] == STEMS[label]).any():
            again, z = _draw_fault(board, n, rng)
            other, y = np.where(alike, again, other), np.where(alike, z, y)
        figures = _hurt_each(figures, other, y)
    return label, figures


def _draw_fault(board: Board, n: int, rng: np.random.Generator) -> tuple[NDArray[np.int64], Array]:
    label, x = rng.choice(possible(board), n), np.zeros(n)
    upwards = rng.random(n) < 0.5
    for k in possible(board):
        for sign in SIGNS.get(FAULTS[k], (0,)):
            mask = (label == k) & ((sign == 0) | (upwards == (sign > 0)))
            top = top_effect(board, FAULTS[k], sign)
            effects = np.exp(rng.uniform(np.log(LOW), np.log(top), mask.sum()))
            x[mask] = sizes_for(board, FAULTS[k], sign, effects)
    return label, x


def _hurt_each(figures: Figures, label: NDArray[np.int64], x: Array) -> Figures:
    full = {key: np.array(np.broadcast_to(value, label.shape)) for key, value in figures.items()}
    for k in np.unique(label):
        mask = label == k
        moved = hurt(FAULTS[k], {key: value[mask] for key, value in full.items()}, x[mask])
        for key, value in moved.items():
            full[key][mask] = value
    return full


def shares(logs: Array) -> Array:
    """Return weights that sum to 1 over the first axis."""
    weights = np.exp(logs - logs.max(0))
    return weights / weights.sum(0)


def scaled(name: str, factor: float) -> Array:
    """Return factors on the spreads, one kind of them larger."""
    factors = np.ones(9)
    factors[{"capacitor": [2], "thresholds": [3, 4]}[name]] = factor
    return factors
