from __future__ import annotations

import hashlib
import math
import os
import subprocess
import sys
from collections.abc import Callable
from pathlib import Path
from typing import Any

import pytest

from benchtool.designs import load_design, parse_design
from benchtool.errors import DesignError, InputError
from benchtool.model.design import (
    Band,
    Design,
    Ic,
    Instrument,
    Limit,
    Part,
    Probe,
    Rule,
    Stage,
    Threshold,
)

EVERY_FEATURE = Path(__file__).parent / "every_feature.toml"
DRAWING = "drawing GH-MV-07 sheet 4"


def limit(
    quantity: str, lower: float | None, upper: float | None, unit: str = "s", **more: Any
) -> Limit:
    more = {"source": "design file", "relative": False} | more
    return Limit(quantity=quantity, lower=lower, upper=upper, unit=unit, **more)


def part(ref: str, value: float, half_rel: float = 0.0) -> Part:
    return Part(ref=ref, value=value, lower_rel=-half_rel, upper_rel=half_rel)


EXPECTED = Design(
    name="Mist valve timer",
    assembly="GH-MV-07",
    revision="C",
    serial_pattern=r"^MV7-\d{6}$",
    supply=Band(nominal=12.0, lower=11.0, upper=13.0),
    temperature=Band(nominal=25.0, lower=10.0, upper=40.0),
    stages=(
        Stage(
            name="spacing",
            topology="astable",
            channel="OUT",
            capacitor="CAP",
            active="low",
            parts={
                "RA": part("RA", 100e3, 0.01),
                "RB": Part(
                    ref="RB",
                    value=330e3,
                    lower_rel=-0.01,
                    upper_rel=0.01,
                    tempco_per_k=50e-6,
                    kind="film",
                ),
                "C": Part(
                    ref="C",
                    value=47e-6,
                    lower_rel=-0.2,
                    upper_rel=0.5,
                    kind="electrolytic",
                    leakage_a=0.5e-6,
                    esr_ohm=2.0,
                    tempco_per_k=1e-4,
                ),
            },
            ic=Ic(family="cmos"),
            control_v=8.0,
            leak_ohm=22e6,
            leak_to_v=12.0,
            derive="rss",
            quantities=("t_high", "duty"),
            limits=(
                limit("t_low", 10.0, 12.0),
                limit("period", 22.0, 28.0, source=DRAWING),
                limit("frequency", 0.04 - 0.04 * 0.05, 0.04 + 0.04 * 0.05, "Hz"),
                limit("duty", 0.53, 0.6, "1"),
                limit("first_high", None, 25.0),
                limit("tau_charge", 18.0, 22.0),
                limit("tau_discharge", 15.0, None),
                limit("jitter_period", None, 0.002, "1", relative=True),
                limit("jitter_cycle", None, 0.005),
            ),
        ),
        Stage(
            name="drip",
            topology="astable-diode",
            channel="DRIP",
            divide=4,
            parts={
                "RA": part("RA", 47e3, 0.05),
                "RB": part("RB", 47e3, 0.05),
                "C": part("C", 100e-9, 0.05),
            },
            diode_drop_v=0.6,
            series_diode_drop_v=0.5,
            ic=Ic(
                family="bipolar",
                upper_threshold=Threshold(value=8.1, of_supply=False),
                lower_threshold=Threshold(value=0.335),
                terms={
                    "u_threshold": 0.005,
                    "u_split": 0.02,
                    "discharge_saturation": 0.037,
                    "discharge_resistance": 9.5,
                    "discharge_leakage": 20e-9,
                    "bias_current": -10e-9,
                    "delay_upper": 0.16e-6,
                    "delay_lower": 0.17e-6,
                    "output_high_drop": 1.5,
                    "output_high_resistance": 50.0,
                    "output_low": 0.1,
                    "output_low_resistance": 10.0,
                },
            ),
            derive="monte-carlo",
            quantities=("period",),
        ),
        Stage(
            name="burst",
            topology="one-shot",
            channel="BURST",
            trigger="OUT",
            parts={"R": part("R", 9.1e3, 0.01), "C": part("C", 1e-7)},
            ic=Ic(
                family=None,
                upper_threshold=Threshold(value=0.667),
                terms={"u_threshold": 0.01},
            ),
            derive="worst-case",
            quantities=("t_high",),
        ),
        Stage(
            name="heartbeat",
            topology="schmitt",
            channel="LED",
            parts={"R": part("R", 1e6), "C": part("C", 1e-6, 0.1)},
            ic=Ic(
                family=None,
                upper_threshold=Threshold(value=0.6),
                lower_threshold=Threshold(value=0.4),
                terms={"u_threshold": 0.05},
            ),
            limits=(limit("period", 0.7, 1.3),),
        ),
        Stage(
            name="valve",
            topology="output-fed",
            channel="VALVE",
            parts={"R": part("R", 68e3, 0.02), "C": part("C", 10e-9, 0.02)},
        ),
        Stage(
            name="hold off",
            topology="power-on",
            parts={"R": part("R", 2.2e6, 0.05), "C": part("C", 2.2e-6, 0.1)},
            limits=(limit("delay", 4.0, None),),
        ),
    ),
    rule=Rule(name="nonbinary", guard=0.8, coverage=0.99),
    instrument=Instrument(timebase_rel=20e-6, jitter_rel=0.0005),
    probe=Probe(r_ohm=10e6, c_f=12e-12, at="capacitor"),
    source=str(EVERY_FEATURE),
    sha256=hashlib.sha256(EVERY_FEATURE.read_bytes()).hexdigest(),
)


@pytest.mark.lower_bounds
def test_every_feature_gives_exactly_its_record() -> None:
    found = load_design(EVERY_FEATURE)
    for got, expected in zip(found.stages, EXPECTED.stages, strict=True):
        assert got == expected
    assert found == EXPECTED


def test_what_is_not_stated_keeps_its_neutral_value() -> None:
    text = """schema = 1
[board]
name = "Mist"
supply = "5 V"
[stage.a]
topology = "astable"
RA = 1e3
RB = 1e3
C = 1e-6
limits.derive = "worst-case"
"""
    design = parse_design(text)
    (stage,) = design.stages
    assert design.temperature == Band(nominal=25.0, lower=25.0, upper=25.0)
    assert (design.rule, design.instrument, design.probe) == (Rule(), Instrument(), Probe())
    assert stage.ic == Ic(family="cmos")
    assert (stage.leak_ohm, stage.leak_to_v, stage.control_v) == (math.inf, 0.0, None)
    assert stage.quantities == ("t_high", "t_low", "period", "duty")
    assert "stage.a.limits.derive" in design.stated
    assert not {"stage.a.limits.quantities", "board.temperature"} & design.stated


@pytest.mark.parametrize(
    "change", [lambda raw: b"\xef\xbb\xbf" + raw, lambda raw: raw.replace(b"\n", b"\r\n")]
)
def test_byte_order_mark_and_windows_line_ends_change_nothing(
    change: Callable[[bytes], bytes], tmp_path: Path
) -> None:
    path = tmp_path / "mist.toml"
    path.write_bytes(change(EVERY_FEATURE.read_bytes()))
    assert load_design(path).stages == EXPECTED.stages


def test_a_missing_file_says_so(tmp_path: Path) -> None:
    with pytest.raises(InputError, match="there is no file") as caught:
        load_design(tmp_path / "none.toml")
    assert caught.value.code == "no-such-file"


def test_a_directory_says_so(tmp_path: Path) -> None:
    with pytest.raises(InputError, match="is a directory") as caught:
        load_design(str(tmp_path))
    assert caught.value.code == "is-directory"


@pytest.mark.skipif(not hasattr(os, "geteuid") or os.geteuid() == 0, reason="root may read all")
def test_a_file_without_permission_says_so(tmp_path: Path) -> None:
    path = tmp_path / "mist.toml"
    path.write_text("schema = 1")
    path.chmod(0)
    with pytest.raises(InputError, match="may not be read") as caught:
        load_design(path)
    assert caught.value.code == "no-permission"


def test_a_refusal_of_permission_has_its_code(
    tmp_path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    def refuse(*_: object, **__: object) -> None:
        raise PermissionError(13, "Permission denied")

    monkeypatch.setattr(Path, "open", refuse)
    with pytest.raises(InputError, match="may not be read") as caught:
        load_design(tmp_path / "mist.toml")
    assert caught.value.code == "no-permission"


@pytest.mark.parametrize("name", ["a\0b", "x" * 5000])
def test_an_impossible_name_is_an_input_error(name: str) -> None:
    with pytest.raises(InputError, match="cannot be read") as caught:
        load_design(name)
    assert caught.value.code == "unreadable"
    assert caught.value.message.count(name) <= 1


def test_a_capture_in_place_of_a_design_is_refused(tmp_path: Path) -> None:
    path = tmp_path / "capture.csv"
    path.write_text("time,volts\n" + "0.1,5\n" * 300_000)
    with pytest.raises(DesignError, match="larger than 1 MiB"):
        load_design(path)


def test_loading_needs_neither_numpy_nor_pandas_and_help_not_even_pydantic() -> None:
    program = (
        "import sys, benchtool.designs as d; assert 'pydantic' not in sys.modules; "
        f"d.load_design({str(EVERY_FEATURE)!r}); "
        "assert not {'numpy', 'pandas', 'scipy', 'rich'} & set(sys.modules)"
    )
    subprocess.run([sys.executable, "-c", program], check=True)
