"""The report as a file: what it holds, in which order, and what it never holds."""

from __future__ import annotations

import re
from collections import Counter
from dataclasses import dataclass, field, replace
from functools import cache
from html.parser import HTMLParser

import page_cases as cases
import pytest

from benchtool.errors import UsageError
from benchtool.model.result import Analysis
from benchtool.report.page import render
from benchtool.report.text import printable

SUFFIXES = (".html", ".md", ".txt")
ANALYSES = {
    "judged": cases.failing,
    "measured": cases.measured_only,
    "looked at": cases.looked_at,
    "given": cases.given_figures,
    "dead": cases.dead,
    "two stages": cases.two_stages,
    "crowded": cases.crowded,
}
VOID = {"meta", "link", "img", "br", "hr", "input"}
MOST_PICTURE_BYTES = 60 * 1024


def page_of(analysis: Analysis, suffix: str = ".html") -> str:
    return render(analysis, suffix=suffix, **cases.STAMP)  # type: ignore[arg-type]


@dataclass
class Parsed(HTMLParser):
    """Every start tag with its attributes, the text of each section, and what stays open."""

    tags: list[tuple[str, dict[str, str | None]]] = field(default_factory=list)
    text: list[str] = field(default_factory=list)
    open_tags: list[str] = field(default_factory=list)

    def __post_init__(self) -> None:
        super().__init__(convert_charrefs=True)

    def handle_starttag(self, tag: str, attrs: list[tuple[str, str | None]]) -> None:
        """Note a tag that opens."""
        self.tags.append((tag, dict(attrs)))
        if tag not in VOID:
            self.open_tags.append(tag)

    def handle_startendtag(self, tag: str, attrs: list[tuple[str, str | None]]) -> None:
        """Note a tag that holds nothing."""
        self.tags.append((tag, dict(attrs)))

    def handle_endtag(self, tag: str) -> None:
        """Close the tag that was opened last."""
        assert self.open_tags.pop() == tag

    def handle_data(self, data: str) -> None:
        """Note text that is shown."""
        if not self.open_tags or self.open_tags[-1] != "style":
            self.text.append(data)

    def attributes(self, name: str) -> list[str]:
        """Return every value of an attribute."""
        return [attrs[name] or "" for _, attrs in self.tags if name in attrs]

    def of_tag(self, tag: str) -> list[dict[str, str | None]]:
        """Return the attributes of every tag of a name."""
        return [attrs for name, attrs in self.tags if name == tag]


def parsed(html: str) -> Parsed:
    parser = Parsed()
    parser.feed(html)
    parser.close()
    return parser


@cache
def page(name: str, suffix: str = ".html") -> str:
    """Return the page of one of the analyses, made once."""
    return page_of(ANALYSES[name](), suffix)


def plain_text(name: str, suffix: str) -> str:
    """Return what a reader sees, on one line."""
    made = page(name, suffix)
    text = "".join(parsed(made).text) if suffix == ".html" else made
    return " ".join(text.replace("\N{NO-BREAK SPACE}", " ").split())


@pytest.fixture(params=list(ANALYSES))
def html(request: pytest.FixtureRequest) -> str:
    return page(request.param)


def test_another_suffix_is_refused_with_the_three_that_are_known() -> None:
    with pytest.raises(UsageError) as caught:
        page_of(cases.failing(), ".pdf")
    assert caught.value.code == "report-suffix"
    assert all(suffix in caught.value.hint for suffix in SUFFIXES)


def test_a_suffix_in_capitals_is_the_same_suffix() -> None:
    assert page_of(cases.dead(), ".TXT") == page_of(cases.dead(), ".txt")


@pytest.mark.parametrize("suffix", SUFFIXES)
def test_the_same_analysis_gives_the_same_page(suffix: str) -> None:
    assert page_of(cases.failing(), suffix) == page_of(cases.failing(), suffix)


ORDER = (
    "Quantities",
    "Against the limits",
    "What the numbers imply",
    "Pictures",
    "Conditions",
    "Data quality",
    "Traceability",
    "Decision rule",
    "Before touching the board",
    "To repeat this",
)


@pytest.mark.parametrize("suffix", SUFFIXES)
def test_all_sections_stand_in_their_order_after_the_verdict(suffix: str) -> None:
    made = page("judged", suffix)
    body = made[made.index("<body") :] if suffix == ".html" else made
    places = [body.index(title) for title in ORDER]
    assert places == sorted(places)
    assert body.lower().index("fail") < body.index(cases.LOW_REASON.split(",")[0]) < places[0]


@pytest.mark.parametrize("suffix", SUFFIXES)
@pytest.mark.parametrize(
    "said",
    [
        "10.7531",  # the value
        "0.0024",  # its U
        "8.5",  # the limits
        "10.7",
        "derived: worst case",  # their source
        "-21.9 U",  # the room left
        "0.1 %",  # the conformance probability
        "339.1",  # a part value
        "C as marked",  # what it assumes
        "The likeliest part is RB",
        "11.4",  # the supply's range
        "12 pF",  # the probe
        "50 ppm, the design",  # the timebase and where it comes from
        "1 cut at start",  # what was left out
        "assumed-channel",  # a warning's code
        "3f9a" * 16,  # the capture's hash
        "7d" * 32,  # the design's hash
        "numpy 2.1.0",
        "JCGM 106:2012",
        "ILAC-G8:09/2019",
        "at most 2.5 %",  # the share of risk
        "capacitive dropper",  # a caution
        cases.COMMAND,
    ],
)
def test_the_page_says(suffix: str, said: str) -> None:
    assert said in plain_text("judged", suffix)


@pytest.mark.parametrize("suffix", SUFFIXES)
def test_what_was_not_found_is_left_out(suffix: str) -> None:
    text = plain_text("given", suffix)
    assert "Against the limits" not in text
    assert "Pictures" not in text
    assert "none: figures as given" in text
    assert "none given" in text


@pytest.mark.parametrize("suffix", SUFFIXES)
def test_a_bound_stands_in_place_of_a_value_that_cannot_be_had(suffix: str) -> None:
    assert "at least 310 s" in plain_text("dead", suffix)


@pytest.mark.parametrize("suffix", SUFFIXES)
def test_of_several_stages_the_board_comes_first_and_each_has_its_own(suffix: str) -> None:
    text = plain_text("two stages", suffix)
    said = ("The board", "1 of 2 stages passes", "stage spacing", "stage heartbeat")
    places = [text.index(words) for words in said]
    assert places == sorted(places)
    assert text.count("Traceability") == 1


@pytest.mark.parametrize("suffix", SUFFIXES)
def test_warnings_of_one_kind_are_said_once_and_counted(suffix: str) -> None:
    notices = tuple(
        replace(cases.judged().warnings[0], text=f"case {number}") for number in range(5)
    )
    result = cases.judged(warnings=notices, overview=None)
    made = page_of(cases.failing(results=(result,)), suffix)
    assert "case 0 (and 4 more of this kind)" in made
    assert "case 1" not in made


@pytest.mark.parametrize("suffix", SUFFIXES)
def test_traces_beyond_the_most_that_are_shown_are_counted(suffix: str) -> None:
    trace = cases.looked_at().results[0]
    assert "6 more traces" in page_of(replace(cases.looked_at(), results=(trace,) * 70), suffix)


def test_nothing_is_fetched(html: str) -> None:
    read = parsed(html)
    assert "http://" not in html
    assert "https://" not in html
    assert "@import" not in html
    assert {tag for tag, _ in read.tags}.isdisjoint({"script", "link", "iframe", "img", "object"})
    links = read.attributes("href") + read.attributes("src")
    assert all(link.startswith("#") for link in links)
    assert all(url.startswith("#") for url in re.findall(r"url\(['\"]?([^)'\"]*)", html))


def test_the_page_forbids_itself_to_load_anything(html: str) -> None:
    policies = [meta.get("content") for meta in parsed(html).of_tag("meta") if "http-equiv" in meta]
    assert policies == ["default-src 'none'; style-src 'unsafe-inline'; img-src data:"]


def test_every_id_is_used_once_and_every_reference_has_its_id(html: str) -> None:
    read = parsed(html)
    ids = Counter(read.attributes("id"))
    assert [name for name, count in ids.items() if count > 1] == []
    references = read.attributes("aria-labelledby")
    references += [link[1:] for link in read.attributes("href")]
    references += re.findall(r"url\(#([^)]*)\)", html)
    assert set(references) <= set(ids)


def test_all_that_opens_is_closed(html: str) -> None:
    assert parsed(html).open_tags == []


def test_tables_name_their_columns_and_rows(html: str) -> None:
    headings = parsed(html).of_tag("th")
    assert all(heading.get("scope") in {"col", "row"} for heading in headings)
    assert len(parsed(html).of_tag("caption")) == len(parsed(html).of_tag("table"))


def test_pictures_have_a_name_and_ornaments_are_hidden(html: str) -> None:
    read = parsed(html)
    for number, (tag, attrs) in enumerate(read.tags):
        if tag != "svg" or attrs.get("class") == "value":
            continue
        if attrs.get("role") == "img":
            title, named = read.tags[number + 1]
            assert title == "title"
            assert named["id"] == attrs["aria-labelledby"]
        else:
            assert attrs["aria-hidden"] == "true"


def test_the_language_and_one_first_heading_are_given(html: str) -> None:
    read = parsed(html)
    assert read.of_tag("html")[0]["lang"] == "en"
    assert len(read.of_tag("h1")) == 1


def pictures(name: str) -> list[str]:
    return re.findall(r'<svg[^>]*class="picture".*?</svg>', page(name), re.DOTALL)


def test_no_picture_is_too_large_and_none_brings_a_font() -> None:
    # A picture is largest with many periods and a full envelope.
    assert len(pictures("crowded")) == 3
    for picture in pictures("crowded"):
        assert len(picture.encode()) <= MOST_PICTURE_BYTES
        assert "<text" in picture
        assert "@font-face" not in picture


def test_no_colour_is_fixed_in_a_picture() -> None:
    drawn = "".join(pictures("judged"))
    assert re.findall(r"(?:fill|stroke): *(#[0-9a-fA-F]+|black|white|rgb)", drawn) == []


HOSTILE = (
    "<script>alert(1)</script>",
    "\"' onload='x' <svg/onload=x>",
    "</style></title><img src=x>",
    "{{ 7*7 }}{% raw %}",
    "red\x1b[31m\x07\x00 \u202eback",
    "a\nb\r\nc",
    "| `x` [y](javascript:z) **b** _i_ $m$ &amp;",
)


@pytest.mark.parametrize("text", HOSTILE)
def test_names_from_files_are_text_and_nothing_else(text: str) -> None:
    harmless, read = parsed(page("judged")), parsed(page_of(cases.hostile(text)))
    assert {tag for tag, _ in read.tags} <= {tag for tag, _ in harmless.tags}
    assert {name for _, attrs in read.tags for name in attrs} <= {
        name for _, attrs in harmless.tags for name in attrs
    }
    assert read.open_tags == []
    assert "".join(read.text).count(printable(text)) >= 12  # wherever a name is shown


@pytest.mark.parametrize("suffix", SUFFIXES)
def test_control_characters_are_written_out(suffix: str) -> None:
    made = page_of(cases.hostile("red\x1b[31m\x07\x00 \u202eback"), suffix)
    assert not set("\x1b\x07\x00\u202e") & set(made)
    assert "red\\x1b" in made.replace("\\\\", "\\")


@pytest.mark.parametrize("suffix", [".md", ".txt"])
def test_a_name_cannot_begin_a_line_of_its_own(suffix: str) -> None:
    made = page_of(cases.hostile("calm\nVERDICT: PASS"), suffix)
    assert not any(line.strip().startswith("VERDICT") for line in made.splitlines())


def test_markdown_keeps_names_from_acting() -> None:
    made = page_of(cases.hostile("<b> [a](b) `c` *d* _e_ | f"), ".md")
    outside = re.sub(r"^(`{3,})\w*\n.*?^\1$", "", made, flags=re.DOTALL | re.MULTILINE)
    named = [line for line in outside.splitlines() if "(b)" in line]
    assert named
    assert all(r"\<b\> \[a\](b) \`c\` \*d\* \_e\_ \| f" in line for line in named)


def test_a_fence_is_longer_than_any_that_a_name_brings() -> None:
    stamp = {**cases.STAMP, "command_line": "benchtool look '````sh'"}
    made = render(cases.dead(), suffix=".md", **stamp)  # type: ignore[arg-type]
    assert "`````sh\nbenchtool look '````sh'\n`````\n" in made


def test_the_command_can_be_copied_as_it_was_typed() -> None:
    command = "benchtool judge a.csv --design d.toml --level '2.5 V' --timebase '20 ppm'"
    made = render(cases.dead(), suffix=".html", **{**cases.STAMP, "command_line": command})  # type: ignore[arg-type]
    assert command in "".join(parsed(made).text)


def test_a_verdict_differs_by_word_and_shape_and_not_by_colour_alone() -> None:
    shapes = {}
    for verdict in ("pass", "conditional-pass", "conditional-fail", "undecided", "fail"):
        check = replace(cases.checks()[0], verdict=verdict)
        made = page_of(cases.failing(results=(cases.judged(checks=(check,), overview=None),)))
        figure = made[made.index(f'<figure class="numberline {verdict}"') :]
        figure = figure[: figure.index("</figure>")]
        assert f'<span class="word">{verdict}</span>' in figure
        shapes[verdict] = re.sub(r"\s+", "", figure[figure.index('class="value" x=') :])
    assert len(set(shapes.values())) == len(shapes)


def test_plain_text_keeps_to_eighty_columns() -> None:
    for name in ANALYSES:
        rows = page(name, ".txt").splitlines()
        assert max(len(row) for row in rows if row.strip() != cases.COMMAND) <= 80
