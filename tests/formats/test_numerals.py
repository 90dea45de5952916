"""Numbers read in bulk are those of ``float`` and of pandas, to the last bit, in any form."""

from __future__ import annotations

import io
import warnings
from collections.abc import Callable

import numpy as np
import pandas as pd
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from benchtool.formats.magnitudes import bounded
from benchtool.formats.text import decoding
from benchtool.formats.text.alike import parse_alike
from benchtool.formats.text.decoding import Decoded, Decoder, Wanted
from benchtool.formats.text.digits import scaled
from benchtool.formats.text.layout import Layout
from benchtool.formats.text.numerals import ROOM, parse_cells
from benchtool.formats.text.rowform import RowForm
from benchtool.model.arrays import FloatArray

FORM = RowForm(mark=b",", decimal=b".", n_fields=2, fields=(0, 1))
PLAIN = ["{:.3f}", "{:08.4f}", "{:+.6f}", "{:.0f}", "{:.9g}", "{:.12g}", "{:.15g}", "{!r}"]
POWERS = ["{:.4e}", "{:+.9E}", "{:.14e}", "{:.16e}"]


def decoder(delimiter: str = ",", decimal: str = ".", n_clocks: int = 0) -> Decoder:
    layout = Layout(
        delimiter=delimiter, decimal=decimal, n_fields=2, start=0, kinds=("N", "N"), rows=()
    )
    return Decoder(layout=layout, wanted=(Wanted(field=0), Wanted(field=1)), n_clocks=n_clocks)


def cells_of(texts: list[str]) -> tuple[FloatArray, list[bool]]:
    """Read cells one a line; return their values and which are left to be read one by one."""
    text = bytes(ROOM) + "\n".join([*texts, ""]).encode()
    stops = np.flatnonzero(np.frombuffer(text, np.uint8) == ord("\n"))
    starts = np.concatenate([[ROOM], stops[:-1] + 1])
    values, odd = parse_cells(text, starts, stops, b".")
    return values, [False] * len(texts) if odd is None else odd.tolist()


@pytest.mark.parametrize("form", [*PLAIN, *POWERS])
@pytest.mark.parametrize("spread", [0, 3, 12, 40])
def test_random_numbers_are_those_of_pandas(form: str, spread: int) -> None:
    rng = np.random.default_rng(spread)
    numbers = rng.normal(0, 1, (3000, 2)) * 10.0 ** rng.integers(-spread, spread + 1, (3000, 2))
    lines = "".join(f"{form.format(float(a))},{form.format(float(b))}\n" for a, b in numbers)
    with warnings.catch_warnings():  # pandas 4 will do nothing else
        warnings.simplefilter("ignore", DeprecationWarning)
        frame = pd.read_csv(io.StringIO(lines), header=None, float_precision="round_trip")
    decoded = decoder().decode(lines.encode())
    expected = bounded(frame.to_numpy(np.float64))  # what no voltage can be is 0 or NaN
    np.testing.assert_array_equal(decoded.table, expected)


@given(
    mantissas=st.lists(st.integers(0, 10**19 - 1), min_size=1, max_size=40),
    power=st.integers(-22, 0),
)
@settings(max_examples=200, derandomize=True)
def test_a_long_mantissa_is_rounded_once_or_left_to_float(mantissas: list[int], power: int) -> None:
    values, unsure = scaled(np.array(mantissas, np.uint64), power)
    for i, mantissa in enumerate(mantissas):
        if unsure is None or not unsure[i]:
            assert values[i] == float(f"{mantissa}e{power}")


@pytest.mark.parametrize("half", [2**53 + 1, 2**54 + 2, 2**54 + 6, 9007199254740993, 2**63 + 1024])
def test_a_tie_is_left_to_float(half: int) -> None:
    _, unsure = scaled(np.array([half, 3], np.uint64), 0)
    assert unsure is not None
    assert unsure.tolist() == [True, False]


@pytest.mark.parametrize(
    "text", ["", "-", "+", ".", "1.2.3", "--1", "1-2", "1e", "e5", "1e+", "1e5e5", "0x10", "1_0",
             "nan", "1 2", "1e12345", "123456789012345678901234567", "1,5", "1:2", "1/2"]
)  # fmt: skip
def test_what_is_no_plain_number_is_left_out_and_spoils_no_other(text: str) -> None:
    values, odd = cells_of(["1.25", text, "-7", text, ".5e1"])
    assert odd == [False, True, False, True, False]
    assert values[[0, 2, 4]].tolist() == [1.25, -7.0, 5.0]


@pytest.mark.parametrize("text", ["5.", ".5", "+1", "-0.0", "007", "1E5", "1e-07", " 3.5 ", "1e22"])
def test_any_spelling_of_a_number_is_read(text: str) -> None:
    values, odd = cells_of(["1", text])
    assert odd == [False, False]
    assert values[1] == float(text)
    assert np.signbit(values[1]) == text.startswith("-")


def test_blanks_around_cells_are_no_part_of_them() -> None:
    decoded = decoder().decode(b"  1.5 ,\t-2\n 10.25,  3  \n")
    assert decoded.table.tolist() == [[1.5, -2.0], [10.25, 3.0]]


def rows_alike(n: int = 9000) -> list[str]:
    return [f"{i * 1e-6:.6f},{1 + (i % 7) / 8:.4f}\n" for i in range(n)]


def test_rows_alike_are_read_by_their_places() -> None:
    lines = rows_alike()
    read = parse_alike("".join(lines).encode(), FORM)
    assert read is not None
    assert read[1] is None
    assert read[0].tolist() == [[float(cell) for cell in line.split(",")] for line in lines]


@pytest.mark.parametrize("place", [0, 1, 63, 4000, 8998, 8999])
@pytest.mark.parametrize("bad", ["0.00000x,1.0000\n", "0.000000;1.0000\n", "0.0000001,1.000\n"])
def test_one_row_that_departs_is_seen_wherever_it_stands(place: int, bad: str) -> None:
    lines = rows_alike()
    lines[place] = bad
    assert parse_alike("".join(lines).encode(), FORM) is None


def test_line_ends_that_fall_in_step_by_chance_are_no_rows() -> None:
    """Two short lines as long as one: every other check of the width would pass."""
    lines = rows_alike(400)
    lines[200] = "0.0,1.0\n0.0,1.0\n"
    assert len(lines[200]) == len(lines[0])
    text = "".join(lines).encode()
    assert parse_alike(text, FORM) is None
    assert decoder().decode(text).table.shape == (401, 2)


def decoded_apart(lines: list[str], **how: int) -> Decoded:
    return decoder(**how).decode("".join(lines).encode())  # type: ignore[arg-type]


@pytest.mark.parametrize("n_clocks", [0, 1])
def test_damage_is_the_same_whatever_is_around_it(
    monkeypatch: pytest.MonkeyPatch, n_clocks: int
) -> None:
    lines = rows_alike(3000)
    for i, bad in {
        3: "\n", 900: "# 1,2\n", 901: "0.1,\n", 902: "0.1\n", 903: "a,b\n", 904: "0.1,ovr\n",
        1700: "0.1,2,3\n", 2998: ",,\n", 2999: "End of data\n",
    }.items():  # fmt: skip
        lines[i] = bad
    whole = decoded_apart(lines, n_clocks=n_clocks)
    monkeypatch.setattr(decoding, "_PART_BYTES", 64)
    parts = decoded_apart(lines, n_clocks=n_clocks)
    np.testing.assert_array_equal(whole.table, parts.table)
    assert (whole.skipped, whole.n_missing, whole.first_missing, whole.n_lines) == (
        parts.skipped, parts.n_missing, parts.first_missing, parts.n_lines,
    )  # fmt: skip
    assert whole.n_lines == 3000
    assert whole.table.shape == (2998, 2)
    assert [line for _, line, _ in whole.skipped if line > 905] == [1700, 2998, 2999]
    assert whole.first_missing == 901


@pytest.mark.parametrize("make", [lambda i: f"{i % 5 - 2}.5", lambda i: "9" * (1 + i % 18)])
def test_widths_that_move_are_read_like_any(make: Callable[[int], str]) -> None:
    lines = [f"{i},{make(i)}\n" for i in range(5000)]
    table = decoder().decode("".join(lines).encode()).table
    assert table[:, 1].tolist() == [float(make(i)) for i in range(5000)]
