from __future__ import annotations

import time

import pytest
from hypothesis import given
from hypothesis import strategies as st

from benchtool.designs.lines import find_lines, line_of

TEXT = '''# comment [a] = 1

schema = 1
[stage.a.limits]   # a header with a comment
quantities = [     # a list over lines ]
  "t_high",
  # "not this",
  "period", "duty",
]
period = { lower = "1 s", upper = "2 s" }
x.y.z = 1
text = """
[nope]
key = 1
"""
other = \'\'\'one
two\'\'\'
[stage.a]
"q.r" = 'it # is'
[[entry]]
x = 1
[[entry]]
x = 2
[entry.sub]
y = [[1, 2],
     [3, 4]]
'''


@pytest.mark.parametrize(
    ("path", "line"),
    [
        (("schema",), 3),
        (("stage",), 4),
        (("stage", "a"), 18),  # its own header, not the first mention in line 4
        (("stage", "a", "limits"), 4),
        (("stage", "a", "limits", "quantities"), 5),
        (("stage", "a", "limits", "quantities", 0), 6),
        (("stage", "a", "limits", "quantities", 1), 8),
        (("stage", "a", "limits", "quantities", 2), 8),
        (("stage", "a", "limits", "period", "upper"), 10),
        (("stage", "a", "limits", "x", "y", "z"), 11),
        (("stage", "a", "limits", "text"), 12),
        (("stage", "a", "limits", "other"), 16),
        (("stage", "a", "q.r"), 19),
        (("entry", 0, "x"), 21),
        (("entry", 1), 22),
        (("entry", 1, "x"), 23),
        (("entry", 1, "sub", "y"), 25),
    ],
)
@pytest.mark.parametrize("newline", ["\n", "\r\n"])
def test_every_kind_of_key_has_its_line(
    path: tuple[str | int, ...], line: int, newline: str
) -> None:
    assert find_lines(TEXT.replace("\n", newline))[path] == line


def test_text_inside_a_string_is_no_key() -> None:
    assert not any("nope" in path or "key" in path for path in find_lines(TEXT))


def test_a_missing_key_has_the_line_of_its_table() -> None:
    lines = find_lines(TEXT)
    assert line_of(("stage", "a", "RB"), lines) == 18
    assert line_of(("board", "name"), lines) is None


@given(
    st.lists(
        st.tuples(
            st.sampled_from(["# note", "", "[t{n}]", "k{n} = 1", "d.k{n} = 'x'", "k{n} = [1,\n2]"]),
            st.sampled_from(["", "  # trailing"]),
        ),
        max_size=12,
    )
)
def test_lines_agree_with_where_each_statement_was_put(rows: list[tuple[str, str]]) -> None:
    text, expected, table, line = "", {}, (), 1
    for n, (row, end) in enumerate(rows):
        statement = row.replace("{n}", str(n)) + end
        if row.startswith("["):
            table = (f"t{n}",)
            expected[table] = line
        elif row.startswith(("k", "d")):
            inner = ("d", f"k{n}") if row.startswith("d") else (f"k{n}",)
            expected[(*table, *inner)] = line
        text += statement + "\n"
        line += statement.count("\n") + 1
    found = find_lines(text)
    assert {path: found[path] for path in expected} == expected


def test_a_long_list_takes_no_long_time() -> None:
    text = "x = [\n" + '"t_high",\n' * 4000 + "]\ny = 1\n"
    start = time.perf_counter()
    lines = find_lines(text)
    # Read once it takes 5 ms; row by row it would take half a minute.
    assert time.perf_counter() - start < 2
    assert lines["y",] == 4003
