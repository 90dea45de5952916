"""The page in a browser: nothing fetched, no complaint, one sheet of paper, light and dark."""

from __future__ import annotations

import json
import re
import shutil
import subprocess
import zlib
from pathlib import Path

import page_cases as cases
import pytest

from benchtool.model.result import Analysis
from benchtool.report.page import render

CHROMIUM = shutil.which("chromium") or shutil.which("chromium-browser")
FLAGS = (
    "--headless",
    "--no-sandbox",
    "--disable-gpu",
    "--disable-quic",
    "--no-first-run",
    "--disable-background-networking",
    "--disable-component-update",
    "--disable-sync",
    "--enable-logging=stderr",
    "--v=0",
    "--host-resolver-rules=MAP * ~NOTFOUND",  # the browser's own errands go nowhere either
    "--hide-scrollbars",
    "--no-pdf-header-footer",
)
PAPERS = {"A4": (595, 842), "letter": (612, 792)}  # points, ISO 216 and ANSI Y14.1
ONE_SHEET = {
    "failing": cases.failing,
    "crowded": cases.crowded,
    "measured": cases.measured_only,
    "dead": cases.dead,
}

pytestmark = [
    pytest.mark.browser,
    pytest.mark.skipif(CHROMIUM is None, reason="Chromium is not installed"),
]


def html_of(analysis: Analysis) -> str:
    return render(analysis, suffix=".html", **cases.STAMP)  # type: ignore[arg-type]


class Browser:
    """Opens one page a time in a fresh profile."""

    def __init__(self, folder: Path) -> None:
        self.folder = folder
        self.page = folder / "page.html"

    def open(self, html: str, *actions: str) -> str:
        """Open a page, do one thing with it, return what the browser logged."""
        self.page.write_text(html, encoding="utf-8")
        profile = self.folder / "profile"
        shutil.rmtree(profile, ignore_errors=True)
        run = subprocess.run(
            [str(CHROMIUM), *FLAGS, f"--user-data-dir={profile}", *actions, self.page.as_uri()],
            capture_output=True,
            text=True,
            timeout=60,
            check=True,
        )
        return run.stderr

    def complaints(self, html: str) -> list[str]:
        """Return what the page brought onto the console."""
        log = self.open(html, "--dump-dom")
        return [line for line in log.splitlines() if ":CONSOLE:" in line]

    def requests(self, html: str) -> set[str]:
        """Return what the page asked for; the browser's own errands have no origin."""
        log = self.folder / "net.json"
        self.open(html, f"--log-net-log={log}", "--dump-dom")
        events = json.loads(log.read_text(encoding="utf-8"))["events"]
        asked = [event["params"] for event in events if "initiator" in event.get("params", {})]
        return {item["url"] for item in asked if item["initiator"] != "not an origin"}

    def print(self, html: str) -> bytes:
        """Return the page as a PDF."""
        target = self.folder / "page.pdf"
        self.open(html, f"--print-to-pdf={target}")
        return target.read_bytes()

    def photograph(self, html: str, *flags: str) -> bytes:
        """Return the page as a PNG."""
        target = self.folder / "page.png"
        self.open(html, "--window-size=900,1200", *flags, f"--screenshot={target}")
        return target.read_bytes()


@pytest.fixture
def browser(tmp_path: Path) -> Browser:
    return Browser(tmp_path)


def on_paper(html: str, paper: str) -> str:
    return html.replace("@page {", f"@page {{ size: {paper};")


def pdf_text(pdf: bytes) -> bytes:
    """Return the PDF with its compressed streams opened, so that every object can be seen."""
    opened = [pdf]
    for start in re.finditer(rb"stream\r?\n", pdf):
        try:
            opened.append(zlib.decompressobj().decompress(pdf[start.end() :]))
        except zlib.error:
            continue  # a stream that is not compressed is in the file as it is
    return b"\n".join(opened)


def sheets(pdf: bytes) -> int:
    return len(re.findall(rb"/Type\s*/Page\b(?!s)", pdf_text(pdf)))


def paper_size(pdf: bytes) -> tuple[float, float]:
    box = re.search(rb"/MediaBox\s*\[\s*0 0 ([\d.]+) ([\d.]+)", pdf_text(pdf))
    assert box is not None
    return float(box[1]), float(box[2])


def test_the_browser_has_nothing_to_complain_about(browser: Browser) -> None:
    assert browser.complaints(html_of(cases.failing())) == []


def test_a_page_that_loads_something_would_be_complained_about(browser: Browser) -> None:
    html = html_of(cases.dead()).replace("<main>", '<main><img src="http://127.0.0.1:9/x.png">')
    assert any("Content Security Policy" in line for line in browser.complaints(html))


def test_no_request_leaves_the_page(browser: Browser) -> None:
    assert browser.requests(html_of(cases.failing())) == set()


def test_a_hostile_name_makes_no_request_and_runs_nothing(browser: Browser) -> None:
    name = "<img src='http://127.0.0.1:9/x.png'><script>console.error('ran')</script>"
    without_policy = re.sub(r"<meta http-equiv[^>]*>", "", html_of(cases.hostile(name)))
    assert browser.requests(without_policy) == set()
    assert browser.complaints(without_policy) == []


def test_a_request_would_be_seen(browser: Browser) -> None:
    html = re.sub(r"<meta http-equiv[^>]*>", "", html_of(cases.dead()))
    url = "http://127.0.0.1:9/x.png"
    assert browser.requests(html.replace("<main>", f'<main><img src="{url}">')) == {url}


@pytest.mark.parametrize("paper", list(PAPERS))
@pytest.mark.parametrize("name", list(ONE_SHEET))
def test_a_single_stage_prints_on_one_sheet(browser: Browser, name: str, paper: str) -> None:
    pdf = browser.print(on_paper(html_of(ONE_SHEET[name]()), paper))
    assert paper_size(pdf) == pytest.approx(PAPERS[paper], abs=1)
    assert sheets(pdf) == 1


def test_several_stages_take_a_sheet_each_and_at_most_one_for_what_they_share(
    browser: Browser,
) -> None:
    assert sheets(browser.print(on_paper(html_of(cases.two_stages()), "letter"))) in {2, 3}


def test_light_and_dark_differ_and_paper_is_always_light(browser: Browser) -> None:
    html = html_of(cases.failing())
    dark = ("--force-dark-mode", "--blink-settings=preferredColorScheme=0")
    assert browser.photograph(html) != browser.photograph(html, *dark)
    printed = re.search(r"@media print \{\s*:root \{ --paper: (#\w+)", html)
    assert printed is not None
    assert printed[1] == "#fff"
