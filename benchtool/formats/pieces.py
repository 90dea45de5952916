"""Runs of stamps without a hole or restart, and where lost rows cut them."""

from __future__ import annotations

from dataclasses import dataclass, field

from benchtool.formats.longsteps import LongSteps


@dataclass(slots=True)
class Piece:
    """A run of rows without a hole or restart; rows are counted over the rows kept."""

    first: int
    first_t: float
    restarts: bool
    chords: list[tuple[int, float, int, float]] = field(default_factory=list)
    sag: float = 0.0

    @property
    def stop(self) -> int:
        """One past its last row."""
        return self.chords[-1][2] + 1

    @property
    def last_t(self) -> float:
        """Its last stamp."""
        return self.chords[-1][3]

    @property
    def ends(self) -> tuple[int, float, int, float]:
        """First row and stamp, last row and stamp."""
        return self.first, self.first_t, self.stop - 1, self.last_t


def parted(piece: Piece, long: LongSteps) -> list[Piece]:
    """Return a piece cut before each long step; all other steps of it are one digit."""
    parts = []
    first, first_t, restarts = piece.first, piece.first_t, piece.restarts
    for row, before, after in zip(
        *(a.tolist() for a in long.of(piece.first, piece.stop)), strict=True
    ):
        chords = [(first, first_t, row - 1, before)]
        parts.append(Piece(first=first, first_t=first_t, restarts=restarts, chords=chords))
        first, first_t, restarts = row, after, False
    chords = [(first, first_t, piece.stop - 1, piece.last_t)]
    return [*parts, Piece(first=first, first_t=first_t, restarts=restarts, chords=chords)]
