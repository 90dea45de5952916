"""Claims: the single highest wins, a tie is refused, sniffing never raises."""

from __future__ import annotations

import pytest
from hypothesis import given, settings
from hypothesis import strategies as st
from read_back import Read

from benchtool.errors import AmbiguousStructureError
from benchtool.formats import FORMATS, Claim, Format, reading

OURS = [loaded for _, loaded in FORMATS.each_of_ours() if isinstance(loaded, Format)]


@given(head=st.binary(max_size=300), suffix=st.sampled_from(["", ".csv", ".vcd", ".npz", ".wav"]))
@settings(max_examples=150, derandomize=True)
def test_sniffing_never_raises_and_noise_is_claimed_once(head: bytes, suffix: str) -> None:
    claims = [format_.sniff(head, suffix) for format_ in OURS]
    assert sum(claim == Claim.YES for claim in claims) <= 1


@pytest.mark.parametrize(
    "head", [b"$timescale 1us $end", b"RIFF\0\0\0\0WAVE", b"\x93NUMPY", b"PK\x03\x04" + bytes(40)]
)
@given(rest=st.binary(max_size=200))
@settings(max_examples=30, derandomize=True)
def test_sniffing_never_raises_behind_magic_bytes(head: bytes, rest: bytes) -> None:
    for format_ in OURS:
        assert format_.sniff(head + rest, "") in Claim


def test_a_tie_is_refused_with_the_option(read: Read, monkeypatch: pytest.MonkeyPatch) -> None:
    class Twice:
        def each_of_ours(self) -> list[tuple[str, object]]:
            text = FORMATS.load("text")
            return [("text", text), ("other", text)]

        def each_outsider(self) -> list[tuple[str, object]]:
            return []

    monkeypatch.setattr(reading, "FORMATS", Twice())
    with pytest.raises(AmbiguousStructureError) as caught:
        read("time_s,OUT\n0,1\n")
    assert "--format" in caught.value.hint


def test_content_wins_over_suffix(read: Read) -> None:
    text = "$timescale 1us $end $var wire 1 ! OUT $end $enddefinitions $end\n#0 0!\n#10 1!\n"
    assert read(text, "a.csv").origin.format == "vcd"


def test_a_money_sign_does_not_make_a_dump(read: Read) -> None:
    text = "$price of the parts\ntime_s,OUT (V)\n" + "".join(
        f"0.{i:03d},{i % 3}.5\n" for i in range(30)
    )
    assert read(text, "a.csv").origin.format == "text"


def test_outsiders_are_asked_only_where_ours_say_no(
    read: Read, monkeypatch: pytest.MonkeyPatch
) -> None:
    def fail(_: object) -> None:
        raise AssertionError("the look-up costs 0.1 s")

    monkeypatch.setattr(type(FORMATS), "each_outsider", fail)
    assert read("time_s,OUT (V)\n" + "".join(f"0.{i:03d},{i % 3}.5\n" for i in range(30)))
