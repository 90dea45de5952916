"""Choosing a dialect: by harmless queries, as before, or as the user says."""

from __future__ import annotations

import time
from contextlib import closing
from pathlib import Path

import pytest
from simulated import DIALECTS, QUICK, TRANSPORTS, assert_whole, simulated
from unseen import Recorder

from benchtool.errors import DesignError, InstrumentError, NotConnectedError, UsageError
from benchtool.instruments import Order
from benchtool_drivers.dialect import find_dialect, known_dialects
from benchtool_drivers.dialect.probing import Fit
from benchtool_drivers.dialect.remembering import NAME, remember, remembered
from benchtool_drivers.loopback.families import FAMILIES
from benchtool_drivers.loopback.serving import serve
from benchtool_drivers.opening import open_instrument

SOUND = Path(__file__).parent / "sound.toml"


@pytest.fixture(autouse=True)
def folder(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> Path:
    """Give each test a config folder of its own."""
    monkeypatch.setenv("XDG_CONFIG_HOME", str(tmp_path))
    return tmp_path / "benchtool"


def own_dialect(folder: Path, name: str, text: str) -> Path:
    path = folder / "dialects" / f"{name}.toml"
    path.parent.mkdir(parents=True, exist_ok=True)
    path.write_text(text, "utf-8")
    return path


@pytest.mark.parametrize(
    ("family", "transport"),
    [*((name, "socket") for name in FAMILIES), *(("keyed", name) for name in TRANSPORTS[1:])],
)
def test_the_dialect_is_found_within_three_seconds_and_remembered(
    family: str, transport: str
) -> None:
    subject = simulated(family)
    looked: list[tuple[Fit, ...]] = []
    with serve(subject, transport) as resource:
        began_s = time.monotonic()
        with closing(open_instrument(resource, look=looked.append)) as instrument:
            assert instrument.dialect == DIALECTS[family]
            assert time.monotonic() - began_s < 3.0
            capture = instrument.acquire(Order())
            assert_whole(capture, subject)
            assert capture.structure[0].evidence.startswith("probed: answers")
        with closing(open_instrument(resource, look=looked.append)) as instrument:
            assert instrument.dialect == DIALECTS[family]
            evidence = instrument.acquire(Order()).structure[0].evidence
            assert evidence == "as before with this identity"
    assert len(looked) == 1
    assert [fit.dialect.name for fit in looked[0] if fit.fits] == [DIALECTS[family]]
    why_not = [fit.why for fit in looked[0] if not fit.fits]
    assert all("-113" in why for why in why_not)


class Listening:
    """Passes on to an instrument, and notes what it is told."""

    def __init__(self, subject: object) -> None:
        self.subject = subject
        self.heard: list[str] = []

    def receive(self, message: bytes) -> None:
        """Note a message."""
        self.heard.append(message.decode())
        self.subject.receive(message)  # type: ignore[attr-defined]

    def output(self) -> bytes | None:
        """Give what the instrument gives."""
        found: bytes | None = self.subject.output()  # type: ignore[attr-defined]
        return found

    def clear(self) -> None:
        """Clear the instrument."""
        self.subject.clear()  # type: ignore[attr-defined]


@pytest.mark.parametrize("transport", ["socket", "hislip"])
def test_probing_sends_queries_alone_and_moves_no_record(transport: str) -> None:
    subject = Listening(simulated("keyed"))
    with serve(subject, transport) as resource:
        open_instrument(resource).close()
    assert all("?" in message for message in subject.heard)
    assert not {"DATA:VAL?", "WAV:DATA?", "DATA?", "CAPT:BLOC?"} & set(subject.heard)
    queries = [message for message in subject.heard if message not in ("*IDN?", "SYST:ERR?")]
    for n, message in enumerate(subject.heard[:-1]):
        if message in queries[:-1] and subject.heard[n + 1] not in ("SYST:ERR?", message):
            # where nothing came back, the link first makes sure that it is in step
            assert subject.heard[n + 1] == "*IDN?"


def test_nothing_fits_an_instrument_of_an_unknown_structure() -> None:
    with (
        serve(Recorder(simulated("keyed").record[0]), "hislip") as resource,
        pytest.raises(InstrumentError) as caught,
    ):
        open_instrument(resource)
    assert caught.value.code == "no-dialect"
    assert "Invented recorder 2" in caught.value.message


def test_two_that_fit_are_refused_with_the_option_that_settles_it(folder: Path) -> None:
    text = find_dialect("list-of-volts").text.replace('"list-of-volts"', '"other-list"')
    own_dialect(folder, "other-list", text)
    with serve(simulated("listed"), "socket") as resource:
        with pytest.raises(UsageError) as caught:
            open_instrument(resource)
        assert caught.value.code == "several-dialects"
        assert "--dialect list-of-volts or --dialect other-list" in caught.value.hint
        with closing(open_instrument(resource, dialect="other-list")) as instrument:
            assert instrument.acquire(Order()).structure[0].evidence == "as you said"


def test_a_preamble_that_cannot_be_is_a_reason_not_to_fit() -> None:
    subject = simulated("positional", fault="nan")
    looked: list[tuple[Fit, ...]] = []
    with serve(subject, "socket") as resource, pytest.raises(InstrumentError) as caught:
        open_instrument(resource, look=looked.append)
    assert caught.value.code == "no-dialect"
    why = {fit.dialect.name: fit.why for fit in looked[0]}["positional-start-stop"]
    assert "inc (volts a code)" in why


def test_a_remembered_dialect_that_no_longer_fits_is_looked_for_again() -> None:
    subject = simulated("keyed")
    remember(subject.identity, "list-of-volts")
    with serve(subject, "socket") as resource, closing(open_instrument(resource)) as instrument:
        assert instrument.dialect == "keyvalue-offset-count"
    assert remembered(subject.identity) == "keyvalue-offset-count"


def test_a_remembered_dialect_whose_file_has_gone_is_looked_for_again() -> None:
    subject = simulated("keyed")
    remember(subject.identity, "gone")
    with serve(subject, "socket") as resource, closing(open_instrument(resource)) as instrument:
        assert instrument.dialect == "keyvalue-offset-count"


def test_identities_of_any_text_are_remembered(folder: Path) -> None:
    for identity in ('a "quoted" one', "back\\slash", "café, 3", ""):
        remember(identity, "some-dialect")
        assert remembered(identity) == (("some-dialect") if identity else None)
    (folder / NAME).write_text("instrument = 3\n")
    with pytest.raises(UsageError) as caught:
        remembered("x")
    assert caught.value.code == "bad-kept-dialects"


def test_a_dialect_of_the_users_own_hides_the_bundled_one(folder: Path) -> None:
    text = find_dialect("list-of-volts").text.replace("common practice", "my manual")
    path = own_dialect(folder, "mine", text)
    assert find_dialect("list-of-volts").source == str(path)
    assert not find_dialect("list-of-volts").is_bundled
    assert find_dialect("scpi99-trace").is_bundled


def test_a_faulty_file_of_the_users_hides_no_other(folder: Path) -> None:
    own_dialect(folder, "slip", SOUND.read_text("utf-8").replace("points", "pionts = 1 #"))
    own_dialect(folder, "fine", SOUND.read_text("utf-8").replace('"sound"', '"fine"'))
    known = known_dialects()
    assert "fine" in known.dialects
    assert len(known.faulty) == 1
    with pytest.raises(DesignError):
        find_dialect("slip")


def test_an_unknown_name_is_told_with_the_nearest() -> None:
    with pytest.raises(UsageError) as caught:
        find_dialect("list-of-volt")
    assert caught.value.code == "no-such-dialect"
    assert "Did you mean list-of-volts?" in caught.value.hint


def test_every_bundled_dialect_is_sound_and_named_as_its_file() -> None:
    bundled = [item for item in known_dialects().dialects.values() if item.is_bundled]
    assert {item.name for item in bundled} >= set(DIALECTS.values())
    assert all(item.source == f"bundled:{item.name}.toml" for item in bundled)
    queries = [item.query for dialect in bundled for item in dialect.probe.ask]
    assert all(query.partition(" ")[0].endswith("?") for query in queries)


def test_an_exchange_is_logged_to_a_file_that_is_closed_with_the_instrument(tmp_path: Path) -> None:
    path = tmp_path / "said.jsonl"
    with serve(simulated("listed"), "socket") as resource:
        instrument = open_instrument(resource, dialect="list-of-volts", settings=QUICK, log=path)
        instrument.acquire(Order())
        instrument.close()
    assert '"command": "DATA?"' in path.read_text("utf-8")


def test_nothing_there_is_told_and_leaves_nothing_open(tmp_path: Path) -> None:
    with pytest.raises(NotConnectedError):
        open_instrument(
            "TCPIP::127.0.0.1::9::SOCKET",
            dialect="list-of-volts",
            settings=QUICK,
            log=tmp_path / "said.jsonl",
        )


@pytest.mark.parametrize("transport", ["socket", "hislip"])
def test_an_instrument_with_an_error_queue_of_its_own_is_found_by_the_users_dialect(
    folder: Path, transport: str
) -> None:
    own_dialect(folder, "unseen", (Path(__file__).parent / "unseen.toml").read_text("utf-8"))
    with serve(Recorder(simulated("keyed").record[0]), transport) as resource:
        began_s = time.monotonic()
        with closing(open_instrument(resource)) as instrument:
            assert instrument.dialect == "paged-recorder"
            assert time.monotonic() - began_s < 3.0
