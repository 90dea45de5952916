"""Files that are hard to open, that change meanwhile, or whose names and headers mean harm."""

from __future__ import annotations

import os
import threading
from html.parser import HTMLParser
from pathlib import Path
from typing import BinaryIO

import pytest
from damage import ROWS, WHOLE, measured, row, table, volts

from benchtool.cli.main import main
from benchtool.formats import read_capture
from benchtool.formats.content import Content
from benchtool.model.capture import Waveform

Capsys = pytest.CaptureFixture[str]

NAMES = [
    "with blanks  .csv",
    "with 'single' and \"double\" quotes.csv",
    "with\nnewline.csv",
    "with\ttab and \x1b[31mred\x07.csv",
    "-starts-with-a-dash.csv",
    "$(touch owned) `touch owned`; rm *.csv",
    "<script>alert('x')<.csv",
    "[bold]markup[] %s {0}.csv",
    "\u202egnp.csv",
    "µ and 雨.csv",
    "undecodable \udcff.csv",
]


@pytest.mark.parametrize("name", NAMES)
@pytest.mark.parametrize("content", [WHOLE, b""], ids=["measured", "refused"])
def test_any_name_is_shown_harmlessly(
    capsys: Capsys, tmp_path: Path, name: str, content: bytes
) -> None:
    path = tmp_path / name
    path.write_bytes(content)
    end = measured(capsys, path)
    assert end.code == (0 if content else 4)
    if content:
        assert end.document["sources"][0]["name"] == str(path)
        end.demand_truth()


@pytest.mark.parametrize("name", NAMES)
def test_a_missing_file_of_any_name_is_one_line(capsys: Capsys, tmp_path: Path, name: str) -> None:
    end = measured(capsys, tmp_path / name)
    assert (end.code, end.error) == (2, "no-such-file")


def test_a_link_that_leads_in_a_circle(capsys: Capsys, tmp_path: Path) -> None:
    one, other = tmp_path / "one.csv", tmp_path / "other.csv"
    one.symlink_to(other)
    other.symlink_to(one)
    end = measured(capsys, one)
    assert (end.code, end.error) == (2, "symlink-loop")


def test_a_link_to_a_capture_is_followed(capsys: Capsys, tmp_path: Path) -> None:
    (tmp_path / "real.csv").write_bytes(WHOLE)
    (tmp_path / "link.csv").symlink_to("real.csv")
    measured(capsys, tmp_path / "link.csv").demand_truth()


def test_a_folder(capsys: Capsys, tmp_path: Path) -> None:
    end = measured(capsys, tmp_path)
    assert (end.code, end.error) == (2, "is-directory")


def test_a_name_too_long(capsys: Capsys, tmp_path: Path) -> None:
    end = measured(capsys, tmp_path / ("x" * 300 + ".csv"))
    assert (end.code, end.error) == (2, "no-such-file")


@pytest.mark.skipif(os.name != "posix" or os.geteuid() == 0, reason="the superuser reads anything")
def test_no_permission(capsys: Capsys, tmp_path: Path) -> None:
    path = tmp_path / "a.csv"
    path.write_bytes(WHOLE)
    path.chmod(0)
    end = measured(capsys, path)
    assert (end.code, end.error) == (2, "no-permission")


def test_a_pipe_that_gives_half_a_row_is_read_to_the_row_before(
    capsys: Capsys, tmp_path: Path
) -> None:
    path = tmp_path / "pipe.csv"
    os.mkfifo(path)
    writer = threading.Thread(target=path.write_bytes, args=(WHOLE[:-4],), daemon=True)
    writer.start()
    assert main(["measure", str(path)]) == 0
    assert "the file ends inside a row" in " ".join(capsys.readouterr().out.split())
    writer.join()


def test_a_device_without_content_is_refused(capsys: Capsys) -> None:
    end = measured(capsys, Path(os.devnull))
    assert (end.code, end.error) == (4, "empty-file")


def test_a_file_that_grows_is_read_as_far_as_it_went(
    tmp_path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    """Another program adds rows, and half a row, each time that the file is opened."""
    path = tmp_path / "growing.csv"
    path.write_bytes(table(ROWS[:300]))
    grown = iter(range(300, 100_000))
    real = Content.open

    def open_grown(content: Content) -> BinaryIO:
        with path.open("ab") as file:
            file.write(f"{row(next(grown))}\n{row(7)[:5]}".encode())
        return real(content)

    monkeypatch.setattr(Content, "open", open_grown)
    (trace,) = read_capture(path, in_memory_bytes=0).traces
    assert isinstance(trace, Waveform)
    for _ in range(2):
        read = [float(v) for piece in trace.samples.blocks() for v in piece]
        assert read == [volts(k) for k in range(300)]
    assert next(grown) > 303, "the file did not grow"


HARMFUL = {
    "escape codes": "\x1b[31mOUT\x1b]0;owned\x07\x9b2J",
    "html": "<script>alert(1)</script><img src=x onerror=alert(1)>&amp;",
    "attribute": '" onmouseover="alert(1)',
    "markup of the screen": "[bold red]OUT[/] [link=http://x]",
    "markdown": "**OUT** | `x` [a](http://x) <!--",
    "right to left": "OUT\u202e\u2066evil",
    "percent and braces": "%s %(x)s {0} {x!r}",
}


CONTROL = {"\x1b", "\x07", "\x9b", "\u202e", "\u2066"}


class _Tags(HTMLParser):
    """Collects the tags and attributes of a page."""

    def __init__(self) -> None:
        super().__init__()
        self.tags: set[str] = set()
        self.attributes: set[str] = set()

    def handle_starttag(self, tag: str, attrs: list[tuple[str, str | None]]) -> None:
        self.tags.add(tag)
        self.attributes |= {name for name, _ in attrs}


def page_of(path: Path, capsys: Capsys, suffix: str) -> str:
    page = path.with_suffix(suffix)
    assert main(["measure", str(path), "--report", str(page), "--quiet"]) == 0
    capsys.readouterr()
    return page.read_text(encoding="utf-8")


@pytest.mark.parametrize("name", HARMFUL)
def test_a_harmful_header_is_shown_harmlessly_everywhere(
    capsys: Capsys, tmp_path: Path, name: str
) -> None:
    title = '"' + HARMFUL[name].replace('"', '""') + ' (V)"'
    lines = [f"Instrument,{title}", f"# {HARMFUL[name]}", f"Time (s),{title}", *ROWS]
    path = tmp_path / "harm.csv"
    path.write_text("\n".join(lines) + "\n", encoding="utf-8")
    plain = tmp_path / "plain.csv"
    plain.write_bytes(WHOLE)
    measured(capsys, path).demand_truth()
    assert main(["look", str(path)]) == 0
    shown = capsys.readouterr().out
    assert not set(shown) & CONTROL
    page, innocent = _Tags(), _Tags()
    page.feed(page_of(path, capsys, ".html"))
    innocent.feed(page_of(plain, capsys, ".html"))
    assert page.tags <= innocent.tags
    assert page.attributes <= innocent.attributes
    for suffix in (".txt", ".md"):
        assert not set(page_of(path, capsys, suffix)) & CONTROL
    assert not set(path.with_suffix(".html").read_text(encoding="utf-8")) & CONTROL
