"""A report is valid, self-contained HTML in which nothing from the data can act; Markdown too."""

from __future__ import annotations

import json
import re
import shutil
import subprocess
from collections.abc import Mapping
from dataclasses import replace
from itertools import pairwise
from pathlib import Path
from xml.etree import ElementTree

import html5lib
import networkx as nx
import numpy as np
import pyarrow as pa
import pytest

import kingpost.core as kp
from kingpost.core.errors import InputError
from kingpost.core.export.report import report_text
from kingpost.core.export.report.charts import apart, powers, whole_ticks
from kingpost.core.export.report.material import Material, now, sources, versions
from kingpost.core.export.report.shortlist import entries, read_shortlist
from kingpost.core.graph import Graph
from kingpost.core.insight.over import parse_over
from kingpost.core.measures import measure

NASTY = (
    "<script>alert(1)</script>", '"><img src=x onerror=alert(1)>', "a&b<!--", "\u202ereversed",
    "x\x1b[31mred", "[link](http://example.org)", "| pipe | `tick` | # head", "</style></title>",
    "${jndi}", "' onload='", "=1+1", "- item",
)  # fmt: skip
MEASURES = ("surfer", "eigenvector", "katz", "degree")


def made(graph: Graph, names: tuple[str, ...] = MEASURES, **more: object) -> Material:
    results = {name: graph.rank(name) for name in names}
    answered = {name: result for name, result in results.items() if result.refusal is None}
    agreement = kp.agree(graph, results) if len(answered) > 1 else None
    about: dict = {"made": "2026-01-02 03:04 UTC", "versions": versions(), "command": "kingpost x"}
    return Material(graph, results, agreement=agreement, **{**about, **more})


@pytest.fixture(scope="module")
def nasty() -> Material:
    rng = np.random.default_rng(4)
    names = [*NASTY, *(f"n{i}" for i in range(20))]
    edges = [(names[i], names[(i + 1) % len(names)], 1.0) for i in range(len(names))]
    edges += [(names[u], names[v], float(w)) for u, v, w in rng.integers(1, len(names), (90, 3))]
    graph = kp.from_edges(edges, name="<b>calls<b>.parquet")
    notes = [text[::-1] for text in NASTY]
    column = [graph.label(i) if i % 3 else None for i in range(graph.n)]
    graph = replace(graph, attributes=pa.table({"<i>team</i>": column, "year": range(graph.n)}))
    found = kp.sweep(graph, "surfer", measure("surfer").settings(), parse_over("damping=0.5:0.9:4"))
    listed = [*zip(NASTY, notes, strict=True), ("<u>gone</u>", "")]
    return made(
        graph,
        question="Who <em>carries</em> & why?",
        shortlist=tuple(entries(graph, listed)),
        within=kp.within(graph, graph.rank("surfer"), "year", 8),
        sweep=found,
        remarks={"teleport": "<b>bold</b>"},
        command="kingpost report '<x>' --question \"</pre>\"",
    )


def parsed(text: str) -> ElementTree.Element:
    """The page by a strict HTML parser: any error in the markup raises."""
    parser = html5lib.HTMLParser(strict=True, namespaceHTMLElements=False)
    return parser.parse(text)


def check_page(text: str) -> ElementTree.Element:
    """Valid, self-contained, and fit to be read without eyes."""
    page = parsed(text)
    everything = list(page.iter())
    tags = {re.sub("{.*}", "", str(item.tag)) for item in everything}
    assert not tags & {"script", "img", "link", "iframe", "object", "embed", "form", "base", "b"}
    for item in everything:
        for name, value in item.attrib.items():
            assert not name.lower().startswith("on"), name
            if name in ("href", "src", "action", "data"):
                assert value.startswith("#"), value
    style = "".join(item.text or "" for item in page.iter("style"))
    assert "url(" not in style
    assert "@import" not in style
    assert page.find("head/title").text
    assert page.attrib["lang"] == "en"
    ids = [item.attrib["id"] for item in everything if "id" in item.attrib]
    assert len(ids) == len(set(ids))
    for item in everything:
        for name in ("aria-labelledby",):
            if name in item.attrib:
                assert item.attrib[name] in ids
        if item.tag == "a":
            assert item.attrib["href"][1:] in ids
    levels = [int(item.tag[1]) for item in everything if re.fullmatch("h[1-6]", str(item.tag))]
    assert levels[0] == 1
    assert levels.count(1) == 1
    assert all(b <= a + 1 for a, b in pairwise(levels))
    for table in page.iter("table"):
        assert table.find("caption").text
        width = {len(row) for row in table.iter("tr")}
        assert len(width) == 1
        assert all("scope" in head.attrib for head in table.iter("th"))
        assert all(len([cell for cell in row if cell.tag == "th"]) >= 1 for row in table.iter("tr"))
    for drawing in (item for item in everything if str(item.tag).endswith("svg")):
        assert drawing.attrib["role"] == "img"
        assert len(drawing.attrib["aria-label"]) > 20
    return page


def words_of(page: ElementTree.Element) -> str:
    return " ".join("".join(page.itertext()).split())


def test_the_page_is_valid_and_nothing_from_the_data_acts(nasty: Material) -> None:
    page = check_page(report_text(nasty, "html"))
    words = words_of(page)
    assert page.find("head/title").text == "Who <em>carries</em> & why?"
    for shown in ("<script>alert(1)</script>", "<b>calls<b>.parquet", "<u>gone</u>", "</pre>"):
        assert shown in words
    assert "\u202e" not in words
    assert "\\u{202e}reversed" in words
    assert "\x1b" not in words
    headings = [item.text for item in page.iter("h2")]
    assert headings == [
        "In short", "Standings", "Agreement", "Shortlist", "How far it is proven",
        "Along damping", "The graph", "Conventions", "Cautions", "To repeat it",
    ]  # fmt: skip
    assert "On the shortlist but not in this graph: <u>gone</u>" in words
    assert "no assessment of safety" in words
    assert nasty.graph.fingerprint in words


def test_the_markdown_holds_the_same_and_escapes_it(nasty: Material) -> None:
    text = report_text(nasty, "markdown")
    assert text.startswith("# Who \\<em\\>carries")
    assert "<script" not in text.replace("\\<script", "")
    assert "\u202e" not in text
    assert "\x1b" not in text
    for line in text.splitlines():
        if line.startswith("|"):
            assert len({len(re.findall(r"(?<!\\)\|", line))} - {0}) == 1
    assert "](http" not in text.replace("\\](", "")
    for heading in ("## Standings", "## Along damping", "## To repeat it"):
        assert heading in text


def test_numbers_are_those_of_the_results(nasty: Material) -> None:
    page = parsed(report_text(nasty, "html"))
    table = next(t for t in page.iter("table") if t.find("caption").text.startswith("The first 20"))
    heads = [cell.text for cell in table.find("thead/tr")]
    rows = [["".join(cell.itertext()) for cell in row] for row in table.find("tbody")]
    order = nasty.within.standing.order
    assert [row[heads.index("node")] for row in rows][:3] == [
        nasty.graph.name(int(node)) for node in order[:3]
    ]
    for row, node in zip(rows, order, strict=False):
        first, last = nasty.results["katz"].standing.range_of(int(node))
        wanted = f"{first:,}" if first == last else f"{first:,}-{last:,}"
        assert row[heads.index("katz")] == wanted


def test_a_report_answers_in_words() -> None:
    graph = kp.from_networkx(nx.karate_club_graph(), weight=None)
    words = words_of(check_page(report_text(made(graph), "html")))
    # Published: 33 first by eigenvector and degree, 0 next (Zachary's club, networkx).
    assert "By random surfer, 33 stands first of 34, which is proven; 0, 32, 2, 1 follow." in words
    assert "The measures agree most between" in words
    assert "Which nodes carry Zachary's Karate Club" in words
    plain = words_of(check_page(report_text(made(graph, ("degree",)), "html")))
    assert "Agreement" not in plain
    assert "There is no convergence to draw" in plain


def test_ties_refusals_and_shortfalls_are_told() -> None:
    graph = kp.from_edges([("a", "x"), ("b", "y")])
    material = made(graph)
    words = words_of(check_page(report_text(material, "html")))
    assert "By random surfer, x, y share the first 2 of 4 ranks." in words
    assert "eigenvector centrality has no answer here: the graph has no cycle" in words
    ring = kp.from_networkx(nx.gnp_random_graph(60, 0.1, seed=2), weight=None)
    results = {"surfer": ring.rank("surfer", max_sweeps=1)}
    short = Material(ring, results, made="", versions={})
    words = words_of(check_page(report_text(short, "html")))
    assert "surfer stopped short (sweep limit)" in words


@pytest.mark.parametrize("edges", [[("a", "a")], [("a", "b"), ("b", "a")]])
def test_the_smallest_graphs(edges: list[tuple[str, str]]) -> None:
    graph = kp.from_edges(edges)
    material = made(graph, shortlist=tuple(entries(graph, [("a", "note")])))
    check_page(report_text(material, "html"))
    assert report_text(material, "markdown")


def test_shortlists_are_read_from_csv_and_json(tmp_path: Path) -> None:
    def read(text: str) -> list[tuple[str, str]]:
        path = tmp_path / "list"
        path.write_text(text)
        return read_shortlist(str(path))

    wanted = [("a", "why, so"), ("b", "")]
    assert read('node,note,rank_surfer\na,"why, so",1\nb,,2\n') == wanted
    assert read("\ufeffnode\na\n") == [("a", "")]
    assert read('[{"node": "a", "note": "why, so"}, {"node": "b"}]') == wanted
    assert (
        read('{"format": 1, "marks": [{"node": "a", "note": "why, so"}, {"node": "b"}]}') == wanted
    )
    assert read('["a", 7]' if False else '["a", {"node": 7}]') == [("a", ""), ("7", "")]
    for text, words in [
        ("name\na\n", "no column node"),
        ("", "no column node"),
        ("[1]", "entry 1 names no node"),
        ("{}", "no list of marks"),
        ("[", "cannot be read as JSON"),
        ('node\n"a', "cannot be read as CSV"),
    ]:
        with pytest.raises(InputError, match=words):
            read(text)
    with pytest.raises(InputError, match="there is no file"):
        read_shortlist(str(tmp_path / "none"))
    (tmp_path / "bytes").write_bytes(b"node\n\xff\xfe\n")
    with pytest.raises(InputError, match="not UTF-8"):
        read_shortlist(str(tmp_path / "bytes"))
    graph = kp.from_edges([("a", "b")])
    found = entries(graph, [("b", "x"), ("zz", ""), ("b", "y")])
    assert [(e.name, e.note, e.node) for e in found] == [("b", "x", 1), ("zz", "", -1)]
    with pytest.raises(InputError, match="a report takes 200"):
        entries(graph, [(str(i), "") for i in range(201)])


def test_files_are_told_by_their_sha256(tmp_path: Path) -> None:
    path = tmp_path / "abc"
    path.write_bytes(b"abc")
    (one,) = sources([str(path), str(path), str(tmp_path / "gone")], kp.Watch())
    # FIPS 180-4's example for "abc".
    assert one.digest == "ba7816bf8f01cfea414140de5dae2223b00361a396177a9cb410ff61f20015ad"
    assert one.size == 3


def test_the_time_of_making_can_be_held(monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.setenv("SOURCE_DATE_EPOCH", "0")
    assert now() == "1970-01-01 00:00 UTC"
    monkeypatch.setenv("SOURCE_DATE_EPOCH", "soon")
    assert now() > "2026"


def test_ticks_and_names_beside_lines() -> None:
    assert [text for _, text in powers(3e-4, 2.0)] == ["1e-4", "1e-3", "1e-2", "1e-1", "1e0", "1e1"]
    assert len(powers(1e-300, 1.0)) <= 8
    assert [text for _, text in whole_ticks(1, 19)] == ["5", "10", "15"]
    assert len(whole_ticks(1, 10**9)) <= 9
    assert apart([10.0, 11.0, 50.0]) == [10.0, 24.0, 50.0]
    assert apart([50.0, 10.0, 10.0]) == [50.0, 10.0, 24.0]


CHROMIUM = next(
    filter(None, map(shutil.which, ("chromium", "chromium-browser", "google-chrome"))), None
)
PROBE = """<script>
addEventListener("load", () => {
  const seen = [...document.querySelectorAll("svg")].map(s => {
    const r = s.getBoundingClientRect();
    return [r.width, r.height, s.querySelectorAll("polyline,circle").length,
            getComputedStyle(s).visibility];
  });
  document.title = JSON.stringify({
    seen, loaded: performance.getEntriesByType("resource").length,
    wide: document.documentElement.scrollWidth - innerWidth,
    ink: getComputedStyle(document.body).color,
  });
});
</script></head>"""


def browse(path: Path, folder: Path, *more: str) -> Mapping[str, str]:
    assert CHROMIUM is not None
    done = subprocess.run(
        [
            CHROMIUM, "--headless", "--no-sandbox", "--disable-gpu", "--dump-dom",
            "--enable-logging=stderr", "--disable-background-networking", "--no-first-run",
            "--host-resolver-rules=MAP * ~NOTFOUND", f"--user-data-dir={folder}",
            *more, path.as_uri(),
        ],
        capture_output=True, text=True, timeout=120, check=True,
    )  # fmt: skip
    console = [line for line in done.stderr.splitlines() if "CONSOLE" in line]
    return {"dom": done.stdout, "console": "\n".join(console)}


@pytest.mark.skipif(CHROMIUM is None, reason="Chromium is not installed")
def test_it_opens_in_a_browser_without_errors_or_network(nasty: Material, tmp_path: Path) -> None:
    text = report_text(nasty, "html")
    page = tmp_path / "report.html"
    page.write_text(text, encoding="utf-8")
    shown = browse(page, tmp_path / "profile")
    assert shown["console"] == ""  # no script error, nothing refused by the page's own policy
    assert "To repeat it" in shown["dom"]
    # A copy that may run one script of ours: what does the browser draw and load?
    probed = re.sub(r'<meta http-equiv="Content-Security-Policy"[^>]*>\n', "", text)
    page.write_text(probed.replace("</head>", PROBE, 1), encoding="utf-8")
    for width in ("1200,900", "500,900"):
        shown = browse(page, tmp_path / "profile", f"--window-size={width}")
        title = re.search("<title>(.*?)</title>", shown["dom"], re.DOTALL)
        assert title is not None
        found = json.loads(title[1])
        assert found["loaded"] == 0
        assert found["wide"] <= 0
        assert len(found["seen"]) == 2 + len(NASTY)
        for wide, high, parts, visibility in found["seen"]:
            assert wide > 300
            assert high > 30
            assert parts >= 1
            assert visibility == "visible"
