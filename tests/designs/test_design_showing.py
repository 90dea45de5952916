from __future__ import annotations

from pathlib import Path

from benchtool.circuits import FAMILIES
from benchtool.designs import NewDesign, load_design, parse_design, show_rows, write_design

EVERY_FEATURE = Path(__file__).parent / "every_feature.toml"
ROWS = {(row.section, row.key): row for row in show_rows(load_design(EVERY_FEATURE))}
PLAIN = {
    (row.section, row.key): row
    for row in show_rows(
        parse_design(
            write_design(
                NewDesign(
                    name="Mist",
                    topology="astable",
                    parts={"RA": "100k 1%", "RB": "330k", "C": "47u -20% 50%"},
                    supply="12 V 5%",
                )
            )
        )
    )
}


def shown(section: str, key: str) -> tuple[str, str]:
    row = ROWS[section, key]
    return row.value, row.origin


def test_stated_values_are_shown_with_tolerance_and_source() -> None:
    assert shown("board", "supply") == ("12 V, from 11 V to 13 V", "stated")
    assert shown("stage.spacing", "RB") == ("330 kΩ ±1 %, film, 50 ppm/K", "stated")
    assert shown("stage.spacing", "C")[0].startswith("47 µF -20 % +50 %, electrolytic")
    assert shown("stage.spacing.limits", "period")[0] == "22 s to 28 s (drawing GH-MV-07 sheet 4)"
    assert shown("stage.spacing.limits", "jitter_period")[0] == "at most 0.2 % of the mean period"
    assert shown("stage.spacing.limits", "tau_discharge")[0] == "at least 15 s"
    assert shown('stage."hold off"', "topology") == ("power-on", "stated")


def test_defaults_are_marked_as_defaults() -> None:
    assert (PLAIN["board", "temperature"].value, PLAIN["board", "temperature"].origin) == (
        "25 °C",
        "default",
    )
    assert PLAIN["decision", "rule"].origin == "default"
    assert PLAIN["probe", "R"].value == "no load"
    assert PLAIN["stage.main", "RB"].value == "330 kΩ (no tolerance stated)"
    assert shown("decision", "rule") == ("nonbinary", "stated")
    assert shown("stage.drip.limits", "quantities") == ("period", "default")


def test_ic_terms_say_where_they_come_from() -> None:
    term = FAMILIES["cmos"].terms["delay_upper"]
    assert PLAIN["stage.main.ic", "delay_upper"].origin == f"default: {term.origin}"
    assert shown("stage.drip.ic", "discharge_resistance") == ("9.5 Ω", "stated")
    assert shown("stage.drip.ic", "upper_threshold") == ("8.1 V", "stated")
    assert shown("stage.burst.ic", "discharge_resistance") == ("0 Ω", "default: taken as ideal")
    assert shown("stage.spacing.ic", "upper_threshold")[0] == "8 V, forced at the control pin"
    assert shown("stage.valve.ic", "family") == ("cmos", "default")


def test_only_terms_that_act_in_the_topology_are_shown() -> None:
    assert ("stage.heartbeat.ic", "discharge_resistance") not in ROWS
    assert ("stage.burst.ic", "lower_threshold") not in ROWS
    assert ("stage.heartbeat.ic", "u_split") in ROWS
