"""Preambles of every kind, windows of every kind, and what contradicts itself."""

from __future__ import annotations

import struct

import numpy as np
import pytest
from scripted import Answer, ScriptedLink, digitiser, points, record, volts

from benchtool.errors import BenchtoolError, RefusedError, ReplyError, UsageError
from benchtool.instruments import Order
from benchtool.model.capture import UniformTime, Waveform

RAMP = bytes(range(10))
SCALE = '[scale]\ny = "none"\n'
FIXED = '[preamble]\nkind = "constant"\nconstant = { dt = 1 }\n'


def dt_s(capture: object) -> float:
    trace = capture.traces[0]  # type: ignore[attr-defined]
    assert isinstance(trace, Waveform)
    assert isinstance(trace.time, UniformTime)
    return trace.time.dt_s


def code_of(tables: str, link: ScriptedLink) -> str:
    with pytest.raises(BenchtoolError) as caught:
        record(tables, link)
    return caught.value.code


# Preambles.


def test_figures_in_a_fixed_order_are_read_by_their_place() -> None:
    tables = f"""
[preamble]
kind = "csv"
query = "PRE? {{channel}}"
separator = ";"
fields = ["-", "points", "dt"]
[data]
query = "DATA?"
dtype = "u1"
{SCALE}"""
    link = ScriptedLink({"PRE? CH2": "0; 10;2.5E-6", "DATA?": RAMP})
    capture = record(tables, link, Order(channels=("CH2",)))
    assert volts(capture).tolist() == list(RAMP)
    assert dt_s(capture) == 2.5e-6
    assert capture.traces[0].channel == "CH2"
    assert link.counted == [10]


def test_a_decimal_comma_in_a_fixed_order_is_told_as_one() -> None:
    tables = f"""
[preamble]
kind = "csv"
query = "PRE?"
fields = ["points", "dt"]
[data]
query = "DATA?"
dtype = "u1"
{SCALE}"""
    with pytest.raises(ReplyError, match="decimal comma"):
        record(tables, ScriptedLink({"PRE?": "10,2,5E-6", "DATA?": RAMP}))


KEYED = f"""
[link]
header_off = ["HEAD OFF"]
[preamble]
kind = "keyvalue"
query = "DATA:PRE?"
separator = ","
assign = ":"
fields = {{ points = "N", dt = "DT", note = "TEXT" }}
[data]
query = "DATA?"
dtype = "u1"
{SCALE}"""


def test_keys_and_values_are_read_in_any_order_with_quotes_and_a_header() -> None:
    answer = ':DATA:PREAMBLE DT: 1E-3,TEXT:"a, b; N:7",n:10'
    link = ScriptedLink({"DATA:PRE?": answer, "DATA?": RAMP})
    capture = record(KEYED, link)
    assert dt_s(capture) == 1e-3
    assert link.said[0] == "HEAD OFF"


def test_a_missing_key_is_named() -> None:
    with pytest.raises(ReplyError, match="no DT, TEXT"):
        record(KEYED, ScriptedLink({"DATA:PRE?": "N:10", "DATA?": RAMP}))


DESCRIBED = f"""
[preamble]
kind = "block"
order = {{ at = 4, type = "u2", little_if = 1 }}
magic = {{ text = "DESC" }}
fields.points = {{ at = 6, type = "u4" }}
fields.dt = {{ at = 10, type = "f8" }}
fields.unit = {{ at = 18, type = "s4" }}
[data]
query = "DATA?"
dtype = "i2"
order = {{ from = "order", map = {{ big = "big", little = "little" }} }}
skip = 22
padding = 2
{SCALE}"""


@pytest.mark.parametrize(("sign", "flag"), [("<", 1), (">", 0)])
def test_a_descriptor_that_leads_the_samples_is_read_in_the_order_of_its_flag(
    sign: str, flag: int
) -> None:
    block = struct.pack(f"{sign}4sHId4s3h2x", b"DESC", flag, 3, 0.25, b"V\0\0\0", -5, 0, 7)
    capture = record(DESCRIBED, ScriptedLink({"DATA?": block}))
    assert volts(capture).tolist() == [-5, 0, 7]
    assert dt_s(capture) == 0.25


@pytest.mark.parametrize(
    "block",
    [
        struct.pack("<4sHId4s3h2x", b"DESX", 1, 3, 0.25, b"V", -5, 0, 7),
        struct.pack("<4sHI", b"DESC", 1, 3),
        struct.pack("<4sHId4s2h2x", b"DESC", 1, 3, 0.25, b"V", -5, 0),
        struct.pack("<4sHId4s4h2x", b"DESC", 1, 3, 0.25, b"V", -5, 0, 7, 9),
        struct.pack("<4sHId4s3h2x", b"DESC", 1, 3, float("nan"), b"V", -5, 0, 7),
    ],
    ids=["magic", "cut", "short", "long", "nan"],
)
def test_a_descriptor_that_does_not_fit_is_refused(block: bytes) -> None:
    with pytest.raises(ReplyError):
        record(DESCRIBED, ScriptedLink({"DATA?": block}))


def test_a_descriptor_may_have_a_query_of_its_own() -> None:
    tables = DESCRIBED.replace('kind = "block"', 'kind = "block"\nquery = "DESC?"')
    tables = tables.replace("skip = 22\npadding = 2\n", "")
    head = struct.pack("<4sHId4s", b"DESC", 1, 3, 0.25, b"V")
    link = ScriptedLink({"DESC?": head, "DATA?": struct.pack("<3h", 1, 2, 3)})
    assert volts(record(tables, link)).tolist() == [1, 2, 3]
    assert link.counted == [None, 6]


TEXT_IN_BLOCK = f"""
[preamble]
kind = "block-text"
separator = ";"
assign = "="
ends = "!"
fields = {{ points = "N", dt = "DT" }}
[data]
query = "DATA?"
dtype = "u1"
{SCALE}"""


def test_a_text_that_leads_the_samples_in_their_block_is_read() -> None:
    capture = record(TEXT_IN_BLOCK, ScriptedLink({"DATA?": b"N=10;DT=0.5!" + RAMP}))
    assert (volts(capture).tolist(), dt_s(capture)) == (list(RAMP), 0.5)
    sized = TEXT_IN_BLOCK.replace('ends = "!"', "size = 16")
    capture = record(sized, ScriptedLink({"DATA?": b"N=10;DT=0.5".ljust(16, b"\0") + RAMP}))
    assert (volts(capture).tolist(), dt_s(capture)) == (list(RAMP), 0.5)
    with pytest.raises(ReplyError, match="holds no '!'"):
        record(TEXT_IN_BLOCK, ScriptedLink({"DATA?": b"N=10;DT=0.5" + RAMP}))


def test_a_text_before_the_block_in_the_same_answer_is_read() -> None:
    tables = f"""
[preamble]
kind = "lead-text"
separator = ";"
assign = " "
fields = {{ points = "NPT", dt = "TINT" }}
[data]
query = "WAVE?"
dtype = "u1"
lead = true
{SCALE}"""
    link = ScriptedLink({"WAVE?": (":WAVE:NR 10;TINT 2E-3;CURVE ", RAMP)})
    with pytest.raises(ReplyError, match="no NPT"):
        record(tables, link)
    link = ScriptedLink({"WAVE?": (":WAVE:NPT 10;TINT 2E-3;:CURVE ", RAMP)})
    assert (volts(record(tables, link)).tolist(), dt_s(record(tables, link))) == (list(RAMP), 2e-3)
    listed = tables.replace('{ points = "NPT", dt = "TINT" }', '["points", "dt"]')
    link = ScriptedLink({"WAVE?": ("10;2E-3;", RAMP)})
    assert volts(record(listed, link)).tolist() == list(RAMP)


DIF = (
    '(DIF (VERSion 1999.0) (IDENtify (NAME "A (b) c")) (ENCode (FORMat INT16)) '
    '(DIMension=X (TYPE IMPLicit SCALe 1E-6 OFFSet -5E-6 SIZE 3 UNITs "S")) '
    '(DIMension=Y (TYPE EXPLicit SCALe 0.5 OFFSet 1 UNITs "V")) (DATA (CURVe (VALues '
)


def test_the_data_interchange_format_is_read_with_a_block_and_with_printed_values() -> None:
    tables = """
[preamble]
kind = "dif"
[data]
query = "TRAC?"
lead = true
trailer = "))))\\n"
dtype = "i2"
[scale]
y = "gain-plus-offset"
"""
    capture = record(tables, ScriptedLink({"TRAC?": (DIF, struct.pack(">3h", 2, -2, 4))}))
    assert (volts(capture).tolist(), dt_s(capture)) == ([2, 0, 3], 1e-6)
    assert points(capture)["first sample"].startswith("-5e-06")
    printed = tables.replace('lead = true\ntrailer = "))))\\n"\ndtype = "i2"', 'wrap = "ascii"')
    capture = record(printed, ScriptedLink({"TRAC?": DIF + "2, -2, 4))))"}))
    assert volts(capture).tolist() == [2, 0, 3]
    for spoilt in (DIF.replace("=X", "=Z"), DIF.replace("SIZE 3", ""), "2, -2, 4", ")" + DIF):
        with pytest.raises(ReplyError):
            record(printed, ScriptedLink({"TRAC?": spoilt + "2, -2, 4))))"}))


def test_a_word_the_map_does_not_know_is_named() -> None:
    tables = f"""
[preamble]
kind = "queries"
ask = {{ sign = "SIGN?", width = "WID?", points = "N?", dt = "DT?" }}
[data]
query = "DATA?"
dtype = {{ from = "sign+width", map = {{ S1 = "i1", U1 = "u1" }} }}
{SCALE}"""
    answers: dict[str, Answer] = {
        "SIGN?": '"S"',
        "WID?": "+1.0E0",
        "N?": "10",
        "DT?": "1",
        "DATA?": RAMP,
    }
    assert volts(record(tables, ScriptedLink(answers))).tolist() == list(RAMP)
    with pytest.raises(ReplyError, match=r"sign\+width is 'S2'"):
        record(tables, ScriptedLink({**answers, "WID?": "2"}))


# Windows.


class Windowed(ScriptedLink):
    """Keeps its window, as instruments do."""

    def __init__(self, style: str, data: bytes = RAMP) -> None:
        super().__init__({})
        self.data, self.style = data, style
        self.window = (0, 3)

    def send(self, command: str) -> None:
        """Note a command, and heed it."""
        super().send(command)
        self.heed(command)

    def heed(self, command: str) -> None:
        """Set the window."""
        word, _, value = command.lstrip(":").partition(" ")
        a, b = self.window
        if word == "STAR":
            self.window = (int(value) - 1, b)
        elif word == "STOP":
            self.window = (a, int(value))
        elif word == "OFFS":
            self.window = (int(value), int(value) + b - a)
        elif word == "COUN":
            self.window = (a, a + int(value))

    def _answer(self, command: str) -> str | bytes:
        self.said.append(command)
        *first, last = command.split(";")
        for part in first:
            self.heed(part)
        word, _, arguments = last.lstrip(":").partition(" ")
        if arguments:
            offset, count = map(int, arguments.split(","))
            return self.data[offset : offset + count]
        a, b = self.window
        found: dict[str, str | bytes] = {
            "LEN?": str(len(self.data)),
            "PRE?": f"{len(self.data[a:b])},1.0",
            "DATA?": self.data[a:b],
        }
        return found[word]


PLACED = '[preamble]\nkind = "csv"\nquery = "PRE?"\nfields = ["points", "dt"]\n'
CHUNKS = {
    "start-stop": 'first = 1\nset = ["STAR {start}", "STOP {stop}"]',
    "offset-count": 'set = ["OFFS {offset}", "COUN {count}"]',
}


@pytest.mark.parametrize("by", CHUNKS)
@pytest.mark.parametrize("join", ["true", "false"])
@pytest.mark.parametrize("most", [1, 3, 5, 10, 11])
def test_a_long_record_is_read_in_pieces_that_make_the_whole(by: str, join: str, most: int) -> None:
    tables = f"""{PLACED}[data]
query = "DATA?"
dtype = "u1"
[chunk]
by = "{by}"
total = "LEN?"
{CHUNKS[by]}
join = {join}
max_points = {most}
{SCALE}"""
    link = Windowed(by)
    assert volts(record(tables, link)).tolist() == list(RAMP)
    assert len([said for said in link.said if "DATA?" in said]) == -(-10 // most)
    assert any(";:DATA?" in said for said in link.said) == (join == "true")


def test_a_joined_message_is_parted_where_it_is_too_long() -> None:
    tables = f"""[link]
max_message = 16
{PLACED}[data]
query = "DATA?"
dtype = "u1"
[chunk]
by = "offset-count"
total = "LEN?"
{CHUNKS["offset-count"]}
join = true
{SCALE}"""
    link = Windowed("offset-count")
    assert volts(record(tables, link)).tolist() == list(RAMP)
    assert not any(";" in said for said in link.said)


def test_a_window_of_an_earlier_transfer_is_never_taken_for_the_record() -> None:
    """Windows that cannot be set leave a preamble that speaks of a part."""
    tables = f"""{PLACED}[data]
query = "DATA?"
dtype = "u1"
[chunk]
by = "none"
total = "LEN?"
{SCALE}"""
    assert code_of(tables, Windowed("none")) == "window-kept"


def test_windows_may_stand_in_the_query() -> None:
    tables = f"""{FIXED}[data]
query = "DATA? {{offset}},{{count}}"
dtype = "u1"
[chunk]
by = "query-args"
total = "LEN?"
max_points = 4
{SCALE}"""
    link = Windowed("query-args")
    assert volts(record(tables, link)).tolist() == list(RAMP)
    assert [said for said in link.said if "DATA" in said] == ["DATA? 0,4", "DATA? 4,4", "DATA? 8,2"]


def test_the_most_points_may_go_by_the_format() -> None:
    tables = f"""[preamble]
kind = "constant"
constant = {{ dt = 1, format = 1 }}
[data]
query = "DATA? {{offset}},{{count}}"
dtype = "u1"
[chunk]
by = "query-args"
total = "LEN?"
max_points = {{ from = "format", map = {{ "0" = 10, "1" = 5 }} }}
{SCALE}"""
    link = Windowed("query-args")
    record(tables, link)
    assert len([said for said in link.said if "DATA" in said]) == 2


def test_blocks_are_read_until_an_empty_one() -> None:
    left = [RAMP[:4], RAMP[4:8], RAMP[8:], b""]
    tables = f"""[preamble]
kind = "constant"
constant = {{ dt = 1, points = 10 }}
[data]
query = "NEXT?"
dtype = "u1"
[chunk]
by = "next"
{SCALE}"""
    link = ScriptedLink({"NEXT?": lambda: left.pop(0)})
    assert volts(record(tables, link)).tolist() == list(RAMP)
    left[:] = [RAMP[:4], b""]
    assert code_of(tables, link) == "wrong-count"
    left[:] = [b""]
    assert code_of(tables, link) == "empty-record"


def test_each_piece_may_lead_with_a_descriptor_of_its_own() -> None:
    left = [b"NN" + RAMP[:5], b"NN" + RAMP[5:]]
    tables = f"""[preamble]
kind = "block"
fields = {{ mark = {{ at = 0, type = "s2" }} }}
constant = {{ dt = 1 }}
[data]
query = "DATA? {{offset}},{{count}}"
dtype = "u1"
skip = 2
[chunk]
by = "query-args"
total = "LEN?"
max_points = 5
{SCALE}"""
    link = ScriptedLink(
        {"LEN?": "10", "DATA? 0,10": b"NN" + RAMP, "DATA? 0,5": left[0], "DATA? 5,5": left[1]}
    )
    assert volts(record(tables, link)).tolist() == list(RAMP)


def test_a_record_whose_length_nothing_tells_is_taken_with_a_warning() -> None:
    tables = f'{FIXED}[data]\nquery = "DATA?"\ndtype = "u1"\n{SCALE}'
    capture = record(tables, ScriptedLink({"DATA?": RAMP}))
    assert [notice.code for notice in capture.warnings] == ["assumed-record-length"]


@pytest.mark.parametrize("length", ["0", "+0.0E0"])
def test_a_record_of_no_samples_is_refused(length: str) -> None:
    tables = f"""{FIXED}[data]
query = "DATA?"
dtype = "u1"
[chunk]
by = "none"
total = "LEN?"
{SCALE}"""
    assert code_of(tables, ScriptedLink({"LEN?": length, "DATA?": b""})) == "empty-record"


@pytest.mark.parametrize("length", ["-1", "1.5", "many", "9.91E37"])
def test_a_length_that_cannot_be_is_refused(length: str) -> None:
    tables = f"""{FIXED}[data]
query = "DATA?"
dtype = "u1"
[chunk]
by = "none"
total = "LEN?"
{SCALE}"""
    with pytest.raises(ReplyError):
        record(tables, ScriptedLink({"LEN?": length, "DATA?": RAMP}))


# Texts and hex.


LED_BY_FIGURES = """
[preamble]
kind = "lead-text"
separator = ","
ends = ":"
fields = ["points", "dt"]
[data]
query = "DATA?"
wrap = "hex"
dtype = "u1"
lead = true
[scale]
y = "none"
"""


def test_figures_lead_printed_samples_in_the_same_answer() -> None:
    capture = record(LED_BY_FIGURES, ScriptedLink({"DATA?": "3,2E-6:01FF80"}))
    assert volts(capture).tolist() == [1, 255, 128]
    assert dt_s(capture) == 2e-6
    assert code_of(LED_BY_FIGURES, ScriptedLink({"DATA?": "4,2E-6:01FF80"})) == "wrong-count"
    with pytest.raises(ReplyError, match="holds no ':'"):
        record(LED_BY_FIGURES, ScriptedLink({"DATA?": "3,2E-6;01FF80"}))


def listed(more: str = "", n: int = 4, link: str = "") -> str:
    return f"""{link}[preamble]
kind = "constant"
constant = {{ dt = 1, points = {n} }}
[data]
query = "DATA?"
wrap = "ascii"
{more}
{SCALE}"""


@pytest.mark.parametrize(
    ("text", "more", "link"),
    [
        ("1,2.5,-3E0,+4", "", ""),
        (" 1, 2.5 ,-3.0E+00, 4,", "", ""),
        ("1;2.5;-3;4", 'separator = ";"', ""),
        ("1 2.5   -3 4", 'separator = " "', ""),
        ("1V,2500mV,-3 V,#H4", "", ""),
        ("1,0;2,5;-3;4", 'separator = ";"', '[link]\ndecimal = ","\n'),
    ],
)
def test_lists_of_numbers_are_read_however_they_are_printed(
    text: str, more: str, link: str
) -> None:
    capture = record(listed(more, link=link), ScriptedLink({"DATA?": text}))
    assert volts(capture).tolist() == [1, 2.5, -3, 4]


def test_a_list_of_another_length_is_refused_and_a_decimal_comma_told() -> None:
    with pytest.raises(ReplyError, match="3 values came where 4") as caught:
        record(listed(), ScriptedLink({"DATA?": "1,2,3"}))
    assert caught.value.code == "wrong-count"
    with pytest.raises(ReplyError, match="decimal comma"):
        record(listed(), ScriptedLink({"DATA?": "1,0,2,5,-3,0,4,25"}))
    with pytest.raises(ReplyError, match="sample 2 is 'x'"):
        record(listed(), ScriptedLink({"DATA?": "1,x,3,4"}))


@pytest.mark.parametrize(
    "text", ["01FF7F80", "01 ff 7f 80", "#H01,#HFF,#H7F,#H80", "0x01FF,0x7F80"]
)
def test_hex_digits_are_read_with_and_without_separators(text: str) -> None:
    tables = listed().replace('wrap = "ascii"', 'wrap = "hex"\ndtype = "u1"')
    assert volts(record(tables, ScriptedLink({"DATA?": text}))).tolist() == [1, 255, 127, 128]
    with pytest.raises(ReplyError):
        record(tables, ScriptedLink({"DATA?": text + "0"}))


def test_a_text_in_a_block_is_read() -> None:
    tables = listed().replace('wrap = "ascii"', 'wrap = "definite"')
    assert volts(record(tables, ScriptedLink({"DATA?": b"1,2,3,4"}))).tolist() == [1, 2, 3, 4]


# Codes that cannot be.


def test_codes_out_of_their_range_are_refused() -> None:
    tables = listed().replace('wrap = "ascii"', 'dtype = "u2"\ncode_range = [0, 4095]')
    assert code_of(tables, ScriptedLink({"DATA?": struct.pack(">4H", 1, 2, 3, 4096)})) == (
        "codes-out-of-range"
    )


def test_words_with_their_bytes_exchanged_are_refused() -> None:
    rng = np.random.default_rng(7)
    clean = np.where(np.arange(1000) % 100 < 40, 40000, 9000) + rng.normal(0, 30, 1000)
    tables = listed(n=1000).replace('wrap = "ascii"', 'dtype = "u2"')
    right = clean.astype(">u2").tobytes()
    assert volts(record(tables, ScriptedLink({"DATA?": right}))).size == 1000
    assert code_of(tables, ScriptedLink({"DATA?": clean.astype("<u2").tobytes()})) == "byte-order"


@pytest.mark.parametrize(
    "codes",
    [
        np.random.default_rng(1).integers(0, 65536, 2000),
        np.random.default_rng(1).choice([-1, 0, 1], 2000, p=[0.5, 0.49, 0.01]),
        np.tile([0, 65535], 1000),
        np.random.default_rng(1).integers(0, 256, 2000) * 256,
        np.random.default_rng(1).normal(32768, 3, 2000).astype(int),
        np.full(2000, 12345),
    ],
    ids=["noise", "quiet-near-zero", "toggling", "left-justified", "quiet", "flat"],
)
def test_rough_and_quiet_records_are_not_taken_for_exchanged_bytes(codes: object) -> None:
    tables = listed(n=2000).replace('wrap = "ascii"', 'dtype = "i2"')
    data = np.asarray(codes).astype(">u2").view(">i2")
    assert volts(record(tables, ScriptedLink({"DATA?": data.tobytes()}))).size == 2000


# Set-up, settings, the error queue.

SET_UP = f"""
[setup]
keep = [{{ query = "FORM?", set = "FORM" }}]
commands = ["FORM INT"]
verify = [{{ query = "FORM?", match = '^INT' }}]
[settings]
level = "LEV?"
scale = "{{channel}}:SCAL?"
gone = "GONE?"
{listed()}"""


def test_the_form_of_the_transfer_is_put_back_and_nothing_is_reset() -> None:
    forms = ["ASC", "INT"]
    link = ScriptedLink(
        {
            "FORM?": lambda: forms.pop(0),
            "LEV?": "2.5",
            "CH1:SCAL?": "1.0",
            "DATA?": "1,2,3,4",
        }
    )
    instrument = digitiser(SET_UP, link)
    capture = instrument.acquire(Order())
    assert points(capture)["level"] == "2.5"
    assert points(capture)["scale CH1"] == "1.0"
    assert [notice.code for notice in capture.warnings] == ["setting-not-read"]
    said = list(link.said)
    instrument.acquire(Order())
    assert link.said[len(said) :] == ["LEV?", "CH1:SCAL?", "DATA?"]
    instrument.close()
    assert link.said[-1] == "FORM ASC"
    assert link.closed
    assert not any("*RST" in command for command in link.said)


def test_a_failed_record_is_followed_by_a_new_set_up() -> None:
    texts = ["1,2,3", "1,2,3,4", "1,2,3,4"]
    link = ScriptedLink({"FORM?": "INT", "LEV?": "1", "DATA?": lambda: texts.pop(0)})
    instrument = digitiser(SET_UP, link)
    with pytest.raises(ReplyError, match="3 values came"):
        instrument.acquire(Order())
    instrument.acquire(Order())
    assert link.said.count("FORM INT") == 2
    instrument.acquire(Order())
    assert link.said.count("FORM INT") == 2


def test_a_connection_made_anew_is_followed_by_a_new_set_up() -> None:
    link = ScriptedLink({"FORM?": "INT", "LEV?": "1", "DATA?": "1,2,3,4"})
    instrument = digitiser(SET_UP, link)
    instrument.acquire(Order())
    link.reopened = True
    capture = instrument.acquire(Order())
    assert "connection-renewed" in {notice.code for notice in capture.warnings}
    assert link.said.count("FORM INT") == 2


def test_a_set_up_that_does_not_take_is_an_error() -> None:
    link = ScriptedLink({"FORM?": "ASC", "DATA?": "1,2,3,4"})
    with pytest.raises(ReplyError, match="does not fit"):
        record(SET_UP, link)
    assert "DATA?" not in link.said


def test_errors_after_the_last_block_spoil_the_record() -> None:
    link = ScriptedLink({})

    def spoilt() -> str:
        link.queue.append('-230,"Data corrupt"')
        return "1,2,3,4"

    link.answers = {"DATA?": spoilt}
    with pytest.raises(RefusedError, match="-230"):
        record(listed(), link)


def test_errors_from_before_are_told_and_the_record_stands() -> None:
    link = ScriptedLink({"DATA?": "1,2,3,4"}, queue=['-113,"Undefined header"'])
    capture = record(listed(), link)
    assert [notice.code for notice in capture.warnings] == ["earlier-errors"]


def test_settings_are_changed_only_as_the_order_says() -> None:
    link = ScriptedLink({"DATA?": "1,2,3,4"})
    record(listed(), link, Order(settings=("TRIG:LEV 2.5",)))
    assert link.said[0] == "TRIG:LEV 2.5"
    with pytest.raises(UsageError) as caught:
        record(listed(), link, Order(settings=("TRIG:LEV 2.5\nABOR",)))
    assert caught.value.code == "bad-setting"


def test_what_the_dialect_does_not_offer_is_refused_before_anything_is_sent() -> None:
    link = ScriptedLink({"DATA?": "1,2,3,4"})
    for order, code in (
        (Order(channels=("CH9",)), "no-such-channel"),
        (Order(force=True), "no-forced-trigger"),
    ):
        with pytest.raises(UsageError) as caught:
            record(listed(), link, order)
        assert caught.value.code == code
    assert link.said == []


def test_the_capture_says_where_it_came_from() -> None:
    capture = record(listed(), ScriptedLink({"DATA?": "1,2,3,4"}))
    assert capture.origin.format == "instrument"
    assert capture.origin.source == "SCRIPT::1::INSTR"
    assert capture.origin.instrument == "Invented,Script,0,1"
    assert len(capture.origin.sha256) == 64
    assert capture.origin.start_ns is not None


def test_progress_is_told_over_all_pieces() -> None:
    tables = f"""{FIXED}[data]
query = "DATA? {{offset}},{{count}}"
dtype = "u1"
[chunk]
by = "query-args"
total = "LEN?"
max_points = 4
{SCALE}"""
    told: list[tuple[int, int]] = []
    digitiser(tables, Windowed("query-args")).acquire(
        Order(), progress=lambda done, of: told.append((done, of))
    )
    assert told == [(4, 10), (8, 10), (10, 10)]


def test_a_header_before_a_long_text_is_taken_off() -> None:
    link = "[link]\nheaders = true\n"
    for text in (":DATA 1,2,3,4", "DATA 1,2,3,4", "1,2,3,4"):
        capture = record(listed(link=link), ScriptedLink({"DATA?": text}))
        assert volts(capture).tolist() == [1, 2, 3, 4]
    with pytest.raises(ReplyError, match="is no number"):
        record(listed(), ScriptedLink({"DATA?": ":DATA 1,2,3,4"}))


def test_the_link_is_told_how_a_block_is_wrapped() -> None:
    more = """dtype = "u2"
wrap = "indefinite"
trailer = "\\r\\n"
length_unit = "points"
skip = 2
padding = 1"""
    tables = listed().replace('wrap = "ascii"', more)
    link = ScriptedLink({"DATA?": b"HH" + struct.pack(">4H", 1, 2, 3, 4) + b"\0"})
    assert volts(record(tables, link)).tolist() == [1, 2, 3, 4]
    del link.given["progress"]
    assert link.given == {"wrap": "indefinite", "trailer": "\r\n", "length_unit_bytes": 2}
    assert link.counted == [11]


def test_a_length_in_bytes_is_turned_into_samples() -> None:
    tables = f"""[preamble]
kind = "constant"
constant = {{ dt = 1, bytes = 8 }}
[data]
query = "DATA?"
dtype = "i2"
{SCALE}"""
    link = ScriptedLink({"DATA?": struct.pack(">4h", 1, 2, 3, 4)})
    capture = record(tables, link)
    assert (volts(capture).tolist(), capture.warnings) == ([1, 2, 3, 4], ())
    assert code_of(tables.replace("bytes = 8", "bytes = 6"), link) == "instrument-reply"


def test_printed_codes_are_codes() -> None:
    tables = listed().replace("dt = 1,", "dt = 1, inc = 0.5,").replace('"none"', '"ref-inc-origin"')
    trace = record(tables, ScriptedLink({"DATA?": "1,2,-3,4"})).traces[0]
    assert isinstance(trace, Waveform)
    assert trace.samples.dtype == np.int32
    assert trace.scale.step_v == 0.5
    trace = record(tables, ScriptedLink({"DATA?": "1,2.5,-3,4"})).traces[0]
    assert isinstance(trace, Waveform)
    assert trace.samples.dtype == np.float64
    assert trace.scale.step_v is None
    capture = record(tables, ScriptedLink({"DATA?": "1,2,9.91E37,4"}))
    np.testing.assert_array_equal(volts(capture), [0.5, 1.0, np.nan, 2.0])
