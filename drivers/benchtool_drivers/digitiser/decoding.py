"""Samples from bytes: binary words, hex digits and texts, each with its count checked."""

from __future__ import annotations

import re

import numpy as np

from benchtool.frozen import frozen_record
from benchtool.model.arrays import AnyArray, FloatArray
from benchtool_drivers.dialect.records import DataKeys
from benchtool_drivers.digitiser.numerals import read_number
from benchtool_drivers.digitiser.talk import Talk, cut

_LEAST_FOR_ORDER = 64
_ROUGH = 0.02
_TIMES_SMOOTHER = 8.0
_LEAST_OF_RANGE = 1 / 16
_FEW = 0.01
_MARKS_V = 9.0e37  # SCPI's marks for no reading are no sign of exchanged bytes


@frozen_record
class Layout:
    """How the samples of a transfer stand in its bytes.

    Attributes:
        dtype: Type of a sample, such as ``u2``, or ``ascii``.
        order: ``big`` or ``little``.
        skip: Bytes before the samples.
    """

    dtype: str
    order: str
    skip: int

    @property
    def is_text(self) -> bool:
        """Whether samples are printed numbers."""
        return self.dtype == "ascii"

    @property
    def numpy_dtype(self) -> np.dtype[np.generic]:
        """The type of a sample in its byte order."""
        return np.dtype((">" if self.order == "big" else "<") + self.dtype)


def decode(talk: Talk, content: bytes, layout: Layout, n_values: int | None) -> AnyArray:
    """Return the samples of one transfer.

    Args:
        talk: Where it came from.
        content: What came, freed of its wrapping.
        layout: How samples stand in it.
        n_values: How many there must be, None where nobody knows.

    Raises:
        ReplyError: If there are more or fewer, or something is no number.
    """
    data: DataKeys = talk.dialect.body.data
    if layout.is_text:
        return _numbers(talk, content[layout.skip :], n_values)
    if data.wrap == "hex":
        return _from_hex(talk, content[layout.skip :], layout, n_values)
    stop = len(content) - data.padding
    return _words(talk, content, layout, n_values, stop)


def _words(talk: Talk, content: bytes, layout: Layout, n_values: int | None, stop: int) -> AnyArray:
    kind = layout.numpy_dtype
    n_bytes = stop - layout.skip
    expected = n_bytes // kind.itemsize if n_values is None else n_values
    if n_bytes != expected * kind.itemsize:
        raise talk.wrong(
            f"the block holds {n_bytes} bytes of samples where {expected} samples of "
            f"{kind.itemsize} bytes are to come",
            hint="Compare dtype, skip, padding and points in the dialect with the manual.",
            command=talk.dialect.body.data.query,
            expected=f"{expected * kind.itemsize} bytes",
            got=f"{n_bytes} bytes",
            code="wrong-count",
        )
    words: AnyArray = np.frombuffer(content, kind, count=expected, offset=layout.skip)
    return words


def _from_hex(talk: Talk, content: bytes, layout: Layout, n_values: int | None) -> AnyArray:
    """Return samples from hex digits, with or without separators and ``#H``."""
    text = content.decode("latin-1")
    digits = re.sub(r"#H|0x|[\s,;]", "", text, flags=re.IGNORECASE)
    try:
        packed = bytes.fromhex(digits)
    except ValueError:
        raise talk.wrong(
            f"the samples are no hex digits: {cut(text)!r}",
            hint='Compare wrap = "hex" in [data] with what the instrument sends.',
            command=talk.dialect.body.data.query,
            expected="pairs of hex digits",
            got=text,
        ) from None
    return _words(talk, packed, layout, n_values, len(packed))


def _numbers(talk: Talk, content: bytes, n_values: int | None) -> FloatArray:
    """Return the numbers of a text."""
    link, separator = talk.dialect.link, talk.dialect.body.data.separator.encode("ascii")
    tokens = content.split(separator) if separator.strip() else content.split()
    if tokens and not tokens[-1].strip():
        tokens.pop()
    if n_values is not None and len(tokens) != n_values:
        raise _wrong_count(talk, tokens, n_values)
    if not tokens:
        return np.empty(0)
    try:
        plain = [token.replace(b",", b".") for token in tokens] if link.decimal == "," else tokens
        return np.array(plain, dtype="S").astype(np.float64)
    except ValueError:
        return np.array([_number(talk, token, n) for n, token in enumerate(tokens, start=1)])


def _number(talk: Talk, token: bytes, n: int) -> float:
    text = token.decode("latin-1")
    try:
        return read_number(text, talk.dialect.link.decimal)
    except ValueError:
        raise talk.wrong(
            f"sample {n} is {cut(text)!r}, which is no number",
            hint="Compare separator in [data] and decimal in [link] with what comes.",
            command=talk.dialect.body.data.query,
            expected="a number",
            got=text,
        ) from None


def _wrong_count(talk: Talk, tokens: list[bytes], n_values: int) -> Exception:
    whole = re.compile(rb"\s*[+-]?\d+\s*")
    doubled = len(tokens) == 2 * n_values and all(map(whole.fullmatch, tokens[0:200:2]))
    return talk.wrong(
        f"{len(tokens)} values came where {n_values} are to come"
        + (": it looks like a decimal comma" if doubled else ""),
        hint="Set the instrument to a decimal point, or to another separator."
        if doubled
        else "The record length that the instrument reports and its samples disagree.",
        command=talk.dialect.body.data.query,
        expected=f"{n_values} values",
        got=b",".join(tokens[:8]).decode("latin-1"),
        code="wrong-count",
    )


def check_codes(talk: Talk, codes: AnyArray) -> None:
    """Refuse codes that there cannot be, and such as look like their bytes were exchanged.

    Raises:
        ReplyError: ``codes-out-of-range`` or ``byte-order``.
    """
    limits = talk.dialect.body.data.code_range
    if limits is not None and codes.size:
        low, high = int(codes.min()), int(codes.max())
        if low < limits[0] or high > limits[1]:
            raise talk.wrong(
                f"codes go from {low} to {high} where {limits[0]} to {limits[1]} can be",
                hint="Byte order, sign or width of the samples is another than the dialect says.",
                command=talk.dialect.body.data.query,
                expected=f"codes from {limits[0]} to {limits[1]}",
                got=f"{low} to {high}",
                code="codes-out-of-range",
            )
    if looks_exchanged(codes):
        raise talk.wrong(
            "the samples look like noise, and smooth with their bytes in the other order",
            hint="The instrument sends another byte order than it, or the dialect, says: compare "
            "order in [data] with the manual.",
            command=talk.dialect.body.data.query,
            expected="samples that follow one another",
            got=", ".join(str(item) for item in codes[:6]),
            code="byte-order",
        )


def looks_exchanged(codes: AnyArray) -> bool:
    """Say whether codes look like words whose bytes stand in the wrong order.

    The noise of a converter is in the low bits. With the bytes exchanged it lands in the high
    ones: neighbours then differ by a good part of the whole span, and hardly at all once the bytes
    are exchanged back. Only codes that fill a part of their range are judged; those of a quiet
    trace near zero could be read either way.
    """
    if codes.dtype.kind == "f" and codes.dtype.itemsize > 1:
        return _floats_exchanged(codes[: 1 << 16])
    if codes.dtype.kind not in "iu" or codes.dtype.itemsize < 2 or codes.size < _LEAST_FOR_ORDER:
        return False
    part = codes[: 1 << 16]
    rough, span = _roughness(part)
    full = 2.0 ** (8 * codes.dtype.itemsize)
    if rough < _ROUGH or span < full * _LEAST_OF_RANGE:
        return False
    return rough > _TIMES_SMOOTHER * _roughness(part.byteswap())[0]


def _floats_exchanged(volts: AnyArray) -> bool:
    """Say whether volts are beyond all measure, and none is with its bytes in the other order."""
    return _share_beyond(volts) > _FEW and _share_beyond(volts.byteswap()) == 0


def _share_beyond(volts: AnyArray) -> float:
    with np.errstate(invalid="ignore", over="ignore"):
        size = np.abs(volts.astype(np.float64))
        mark = (size >= _MARKS_V) & (size < 1e38)
        beyond = ~np.isfinite(size) | ((size > 1e9) & ~mark) | ((size > 0) & (size < 1e-15))
    return float(np.count_nonzero(beyond)) / max(volts.size, 1)


def _roughness(codes: AnyArray) -> tuple[float, float]:
    """Return the mean step between neighbours over the span, and the span."""
    values = codes.astype(np.float64)
    span = float(values.max() - values.min())
    return (float(np.abs(np.diff(values)).mean()) / span if span else 0.0), span
