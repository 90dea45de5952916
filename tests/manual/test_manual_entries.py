"""The manual is complete in itself: nothing empty, nothing twice, no reference to nowhere."""

from collections import Counter

import pytest

from benchtool.manual import Entry, entries, lookup, nearest
from benchtool.manual.entries import _folded

LONGEST_TEXT = 700
"""Characters; about a minute of reading at 200 words a minute is 1200, this is half of it."""

BY_TOPIC = pytest.mark.parametrize("topic", sorted({entry.topic for entry in entries()}))


def entries_of(topic: str) -> list[Entry]:
    return [entry for entry in entries() if entry.topic == topic]


@BY_TOPIC
def test_an_entry_says_what_it_is_and_where_it_is_from(topic: str) -> None:
    for entry in entries_of(topic):
        assert entry.title, entry.term
        assert entry.topic, entry.term
        assert entry.source, entry.term
        assert entry.text.endswith((".", ":")), (entry.term, entry.text[-20:])
        assert len(entry.text) <= LONGEST_TEXT, entry.term


@BY_TOPIC
def test_formulas_fit_a_screen_of_80_columns(topic: str) -> None:
    """With the indent of the screen, six columns are left free."""
    for entry in entries_of(topic):
        assert all(len(line) <= 74 for line in entry.formula.splitlines()), entry.term


@BY_TOPIC
def test_references_lead_to_other_entries(topic: str) -> None:
    for entry in entries_of(topic):
        for term in entry.see_also:
            found = lookup(term)
            assert found is not None, f"{entry.term} refers to {term!r}"
            assert found is not entry, f"{entry.term} refers to itself"


@BY_TOPIC
def test_a_title_is_a_phrase_and_not_the_term_again(topic: str) -> None:
    for entry in entries_of(topic):
        assert not entry.title.endswith("."), entry.term
        assert _folded(entry.title) != _folded(entry.term), entry.term


def test_no_term_and_no_alias_stands_twice() -> None:
    names = [name.casefold() for entry in entries() for name in (entry.term, *entry.aliases)]
    assert [name for name, n in Counter(names).items() if n > 1] == []


def test_no_alias_is_its_own_term_with_other_joints() -> None:
    for entry in entries():
        names = [_folded(name) for name in (entry.term, *entry.aliases)]
        assert len(names) == len(set(names)), entry.term


def test_every_entry_is_found_by_its_term_and_by_every_alias() -> None:
    for entry in entries():
        for name in (entry.term, *entry.aliases):
            assert lookup(name) is entry


@pytest.mark.parametrize("term", ["T_HIGH", "T High", "T-HIGH", " High Time "])
def test_case_and_joints_do_not_matter(term: str) -> None:
    assert lookup(term) is lookup("t_high")


def test_joints_matter_where_two_entries_differ_in_them_alone() -> None:
    """The design key of an IC's term and the fault of the same name."""
    assert "volts below the supply" in lookup("output_high_drop").text
    assert lookup("output-high-drop").topic.startswith("Faults")


def test_an_option_and_a_word_of_the_same_name_are_apart() -> None:
    assert lookup("--level") is lookup("reference level")
    assert lookup("level") is not lookup("--level")


def test_an_unknown_term_gives_its_nearest() -> None:
    assert lookup("gard band") is None
    assert nearest("gard band")[0] == "guard band"
    assert nearest("C-lowe")[0] == "C-low"
    assert len(nearest("stuck")) <= 3
    assert nearest("xyzzyxyzzy") == ()


WORDS = (
    "capture trace level edge interval t_high t_low period frequency duty jitter design stage "
    "topology part limit verdict suspect finding reading record station operator serial pass "
    "conditional-pass conditional-fail undecided fail unusable u U k"
)
FIGURES = (
    "first_high delay drift period_sd period_pp cycle_rms cycle_peak grid_share jitter_period "
    "jitter_cycle stability adev tau_charge tau_discharge tau_RA tau_ratio effective estimate "
    "change assumes within_tolerance p_conform accept_lower accept_upper lower upper value dof n "
    "at_least at_most samples sample_interval_s tick_s start_s duration_s gaps dropped sha256 "
    "source probability group gain_bits mid_v structure may_be schema made_at"
)
CIRCUITS = "astable astable-diode output-fed one-shot schmitt power-on bipolar cmos STUCK ESR"
FAULTS = (
    "healthy C-low C-high C-leaky C-esr C-open C-short RA-low RA-high RA-open RB-low RB-high "
    "RB-open R-low R-high R-open R-all-low R-all-high discharge-leak discharge-weak control-low "
    "control-high control-bypass-missing upper-threshold lower-threshold node-leak-to-supply "
    "slow-ic probe-load wrong-ic-family output-high-drop output-low-rise diode-open diode-short "
    "supply-ripple two-faults unexplained stuck-high stuck-low drifting missed-edge false-trigger "
    "ripple-lock"
)
RULES = "guarded simple nonbinary guard coverage worst-case rss monte-carlo"
FILES = "vcd npz npy wav csv transition-list sampled-logic delimiter decimal timescale"
KEYS = (
    "family upper_threshold lower_threshold u_threshold u_split discharge_saturation "
    "discharge_resistance discharge_leakage bias_current delay_upper delay_lower output_high_drop "
    "output_high_resistance output_low output_low_resistance control diode_drop series_diode_drop "
    "leak leak_to divide active tolerance tempco kind leakage esr supply temperature timebase "
    "serial_pattern derive quantities"
)
EXITS = "exit-0 exit-1 exit-2 exit-3 exit-4 exit-5 exit-6 exit-7 exit-8 exit-70 exit-130 exit-141"


@pytest.mark.parametrize(
    "term", f"{WORDS} {FIGURES} {CIRCUITS} {FAULTS} {RULES} {FILES} {KEYS} {EXITS}".split()
)
def test_every_word_of_the_documents_and_files_has_an_entry(term: str) -> None:
    assert lookup(term) is not None
