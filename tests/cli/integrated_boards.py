"""Boards whose node is integrated by scipy, written as captures: nothing of the circuit model."""

from __future__ import annotations

import math
from dataclasses import dataclass
from pathlib import Path

import numpy as np
from scipy.integrate import solve_ivp


@dataclass(frozen=True, kw_only=True)
class Board:
    """An astable of a timer IC as it is, parts by their own values."""

    ra: float = 100e3
    rb: float = 330e3
    c: float = 47e-6
    supply: float = 12.0
    upper: float = 2 / 3
    lower: float = 1 / 3
    leak: float = math.inf
    probe: float = math.inf
    esr: float = 0.0
    switch_ohm: float = 9.0
    drop: float = 0.05


def _current(board: Board, node_v: float, *, high: bool) -> float:
    """Return the current into the capacitor, from Kirchhoff's law at the node."""
    if high:
        fed = (board.supply - node_v) / (board.ra + board.rb)
    else:
        pin_g = 1 / board.ra + 1 / board.switch_ohm + 1 / board.rb
        pin_v = (board.supply / board.ra + node_v / board.rb) / pin_g
        fed = (pin_v - node_v) / board.rb
    return fed - node_v / board.leak - node_v / board.probe


def _node_v(board: Board, inside_v: float, *, high: bool) -> float:
    """Return the node's voltage: the current is linear in it, so two points give it."""
    if not board.esr:
        return inside_v
    at_0, at_1 = (_current(board, v, high=high) for v in (0.0, 1.0))
    return (inside_v + board.esr * at_0) / (1 - board.esr * (at_1 - at_0))


def integrate(board: Board, cycles: int, start_v: float | None = None) -> tuple[list[float], list]:
    """Return the times of the edges, the output high at first, and the solutions between them."""
    inside_v = board.lower * board.supply if start_v is None else start_v
    at_s, high, edges, pieces = 0.0, True, [], []
    for _ in range(2 * cycles):
        goal_v = (board.upper if high else board.lower) * board.supply

        def flow(_: float, v: np.ndarray, high: bool = high) -> list[float]:
            return [_current(board, _node_v(board, v[0], high=high), high=high) / board.c]

        def meets(_: float, v: np.ndarray, high: bool = high, goal_v: float = goal_v) -> float:
            return _node_v(board, v[0], high=high) - goal_v

        meets.terminal, meets.direction = True, 1.0 if high else -1.0  # type: ignore[attr-defined]
        longest_s = 60 * (board.ra + board.rb) * board.c
        found = solve_ivp(
            flow,
            (at_s, at_s + longest_s),
            [inside_v],
            events=meets,
            rtol=1e-9,
            atol=1e-9,
            dense_output=True,
        )
        assert found.status == 1, "the board stands still"
        at_s, inside_v = float(found.t[-1]), float(found.y[0, -1])
        edges.append(at_s)
        pieces.append((found.sol, high))
        high = not high
    return edges, pieces


def write_board(
    path: Path, board: Board, *, n: int = 3000, node: bool = False, power_up: bool = False
) -> Path:
    """Write six cycles or so as a capture of the output, with the node where asked."""
    rng = np.random.default_rng(n + len(path.name))
    edges, pieces = integrate(board, 8, 0.0 if power_up else None)
    early_s = 2.0 if power_up else -0.3 * edges[0]
    times_s = np.linspace(0.0, edges[-3] + early_s, n)
    at = np.searchsorted(edges, times_s - early_s)
    high = np.where(times_s < early_s, False, at % 2 == 0)
    columns = [times_s, np.where(high, board.supply - board.drop, 0.03) + rng.normal(0, 0.02, n)]
    names = ["Time (s)", "OUT (V)"]
    if node:
        inside_v = [float(pieces[k][0](t - early_s)[0]) for k, t in zip(at, times_s, strict=True)]
        columns.append(
            np.array(
                [_node_v(board, v, high=pieces[k][1]) for k, v in zip(at, inside_v, strict=True)]
            )
            + rng.normal(0, 0.005, n)
        )
        names.append("NODE (V)")
    rows = (",".join(f"{value:.5f}" for value in row) for row in zip(*columns, strict=True))
    path.write_text(",".join(names) + "\n" + "\n".join(rows) + "\n", encoding="utf-8")
    return path
