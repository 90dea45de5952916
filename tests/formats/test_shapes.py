"""Rows of several shapes in one block: each is decoded at once, and nothing else is lost by it."""

from __future__ import annotations

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from benchtool.formats.text import decoding, shapes
from benchtool.formats.text.decoding import Decoded, Decoder, Wanted
from benchtool.formats.text.layout import Layout
from benchtool.formats.text.rowform import RowForm
from benchtool.formats.text.shapes import parse_mixed

FORMS = ("%.6f,%.4f", "%.6f,%+.3e", "%.9g,%.12g", "%.4E,%.8E", "%.17g,%.17g", "%d,%.2f")
ODD = (
    "",
    "# remark",
    "0.5",
    "0.5,",
    ",1",
    "a,b",
    "1,2,3",
    "1,2e",
    "ee,ee",
    '"1","2"',
    "1 ,\t2",
    "--",
)


def decoder(mark: str = ",", decimal: str = ".") -> Decoder:
    layout = Layout(delimiter=mark, decimal=decimal, n_fields=2, start=0, kinds=("N", "N"), rows=())
    return Decoder(layout=layout, wanted=(Wanted(field=0), Wanted(field=1)), n_clocks=1)


def same(one: Decoded, other: Decoded) -> None:
    np.testing.assert_array_equal(one.table.view(np.uint64), other.table.view(np.uint64))
    assert one.skipped == other.skipped
    assert (one.n_missing, one.first_missing) == (other.n_missing, other.first_missing)
    assert one.n_lines == other.n_lines


@given(
    forms=st.lists(st.sampled_from(FORMS), min_size=1, max_size=3),
    seed=st.integers(0, 10_000),
    odd=st.lists(st.tuples(st.integers(0, 199), st.sampled_from(ODD)), max_size=6),
    ends=st.sampled_from(
        [("\n",), ("\r\n",), ("\n", "\r\n"), ("\r",), ("\r\r\n", "\n"), ("\r\n", "\r")]
    ),
    tail=st.sampled_from(["", "\n", "\r\n\r\n", "1,2", " \n"]),
    decimal=st.sampled_from([".", ","]),
)
@settings(max_examples=400, derandomize=True, deadline=None)
def test_shapes_give_what_cells_give(
    forms: list[str],
    seed: int,
    odd: list[tuple[int, str]],
    ends: tuple[str, ...],
    tail: str,
    decimal: str,
) -> None:
    rng = np.random.default_rng(seed)
    volts = rng.normal(0, 5, 200) * rng.choice([1, 1, 1e-3, 0], 200)
    rows = [
        forms[int(k)] % (i, v)
        for i, v, k in zip(
            range(200), volts.tolist(), rng.integers(0, len(forms), 200), strict=True
        )
    ]
    for at, row in odd:
        rows[at] = row
    text = "".join(row + ends[i * 7 % 11 % len(ends)] for i, row in enumerate(rows)) + tail
    reader = decoder()
    if decimal == ",":
        text, reader = text.replace(",", ";").replace(".", ","), decoder(";", ",")
    with pytest.MonkeyPatch.context() as patched:
        patched.setattr(shapes, "_LEAST", 5)
        by_shapes = reader.decode(text.encode())
        patched.setattr(decoding, "parse_mixed", lambda *_: None)
        patched.setattr(decoding, "parse_alike", lambda *_: None)
        same(by_shapes, reader.decode(text.encode()))


FORM = RowForm(mark=b",", decimal=b".", n_fields=2, fields=(0, 1))


@pytest.mark.parametrize("form", ["%.6f,%.4f\n", "%.4E,%+.6E\n", "%.6f,%.4f\r\n"])
def test_signs_exponents_and_another_digit_leave_no_row_to_be_read_cell_by_cell(form: str) -> None:
    volts = np.random.default_rng(4).choice([-0.25, 0.5, 12.25, -12.5, 0.03125], 4000).tolist()
    read = parse_mixed(
        "".join(form % (1 + i * 1e-3, v) for i, v in enumerate(volts)).encode(), FORM
    )
    assert read is not None
    table, left, stops = read
    assert not left.size
    assert stops.size == 4000
    digits = 4 if "f" in form else 6
    assert table[:, 1].tolist() == [
        float(f"{v:.{digits}{'f' if 'f' in form else 'e'}}") for v in volts
    ]


def test_a_damaged_row_among_thousands_is_the_only_one_left() -> None:
    rows = [f"{i * 1e-3:.4f},{(-1) ** i * 1.5:.3f}\n" for i in range(2000)]
    rows[700] = rows[700].replace(".", "x", 1)
    read = parse_mixed("".join(rows).encode(), FORM)
    assert read is not None
    assert read[1].tolist() == [700]


@pytest.mark.parametrize("cell", ["eee", "e1e", "1e2e3", "e", "1e", "-e-e"])
def test_cells_with_more_than_one_exponent_at_the_very_end_hold_no_number(cell: str) -> None:
    told = decoder().decode(f"0.5,1e3\n0.75,{cell}\n".encode())
    assert told.table[0].tolist() == [0.5, 1000.0]
    assert np.isnan(told.table[1, 1])
    assert told.n_missing == 1
