"""The page: whatever users' files hold stays text, nothing is asked for from outside, and every fault can be found."""

from __future__ import annotations

import base64
import hashlib
import io
import json
import re
from collections import Counter
from dataclasses import replace
from html.parser import HTMLParser
from importlib.resources import files

import numpy as np
import pytest
from PIL import Image

from structviz.analysis import Analysis
from structviz.model import Mechanism
from structviz.references import REFERENCES
from structviz.report import html as page
from structviz.report.html import live_script, notice_page, page_text
from structviz.report.markup import element, given, joined, table
from structviz.report.methods import CITED, METHODS, methods_of, short_source, sources_of
from structviz.report.names import printable
from structviz.report.page_words import card_text, how_sure, verdict_line
from structviz.scenarios import Dependence, Scenario, Sensitivity
from structviz.stress.influence import Influence
from structviz.views import palette

VOID = {"meta", "link", "input", "img", "br", "hr"}


class Tree(HTMLParser):
    """What a browser would make of a page: elements with their attributes and the text directly or indirectly in them."""

    def __init__(self, text: str) -> None:
        super().__init__(convert_charrefs=True)
        self.elements: list[dict] = []
        self.open: list[dict] = []
        self.feed(text)
        self.close()

    def handle_starttag(self, tag: str, attributes: list) -> None:
        entry = {"tag": tag, "text": "", **dict(attributes)}
        self.elements.append(entry)
        if tag not in VOID:
            self.open.append(entry)

    def handle_endtag(self, tag: str) -> None:
        assert self.open, f"</{tag}> closes nothing"
        assert self.open[-1]["tag"] == tag, f"</{tag}> closes <{self.open[-1]['tag']}>"
        self.open.pop()

    def handle_data(self, data: str) -> None:
        for entry in self.open:
            entry["text"] += data

    def of(self, tag: str, **attributes: str) -> list[dict]:
        """Return the elements of a tag whose attributes hold the words given."""
        wanted = {key.rstrip("_").replace("_", "-"): value for key, value in attributes.items()}
        return [e for e in self.elements if e["tag"] == tag and all(v in (e.get(k) or "").split() for k, v in wanted.items())]


@pytest.fixture(scope="module")
def text(analysis: Analysis) -> str:
    return page_text(analysis, pictures={})


@pytest.fixture(scope="module")
def tree(text: str) -> Tree:
    return Tree(text)


def test_elements_close_in_order(tree: Tree) -> None:
    assert not tree.open


def test_names_of_users_stay_text(analysis: Analysis, tree: Tree) -> None:
    shown = {int(row["data-fault"]): row for row in tree.of("button", class_="fault")}
    assert sorted(shown) == list(range(len(analysis.faults)))
    names = [entry["text"] for entry in tree.of("bdi")]
    for result in analysis.faults:
        assert printable(result.fault.name) in names


def test_no_script_runs_but_ours(text: str, tree: Tree) -> None:
    policy = next(e["content"] for e in tree.of("meta") if e.get("http-equiv") == "Content-Security-Policy")
    allowed = re.search(r"script-src ([^;]*)", policy)
    assert allowed is not None
    run = [e for e in tree.of("script") if e.get("type") == "module"]
    hashes = {f"'sha256-{base64.b64encode(hashlib.sha256(e['text'].encode()).digest()).decode()}'" for e in run}
    assert set(allowed[1].split()) == hashes
    assert not [key for e in tree.elements for key in e if key.startswith("on")]
    assert "alert(1)" in text


def test_no_request_can_leave(text: str, tree: Tree) -> None:
    policy = next(e["content"] for e in tree.of("meta") if e.get("http-equiv") == "Content-Security-Policy")
    assert policy.startswith("default-src 'none'")
    assert "connect-src" not in policy
    for e in tree.elements:
        for key in ("src", "href", "action", "data", "poster", "srcset"):
            assert re.match(r"data:|#", e.get(key) or "#"), e
    style = "".join(e["text"] for e in tree.of("style"))
    assert "url(" not in style
    assert "@import" not in style


def test_no_control_or_direction_mark_is_left(text: str) -> None:
    assert not re.search("[\x00-\x08\x0b-\x1f\x7f\u200e\u200f\u202a-\u202e\u2066-\u2069]", text)


def test_the_same_analysis_gives_the_same_page(analysis: Analysis, text: str) -> None:
    assert page_text(analysis, pictures={}) == text


def test_every_fault_has_one_card_with_its_text(analysis: Analysis, tree: Tree) -> None:
    cards = tree.of("article", class_="card")
    assert Counter(int(card["data-fault"]) for card in cards) == Counter(range(len(analysis.faults)))
    texts = {e["text"] for e in tree.of("pre", class_="as-text")}
    assert texts == {card_text(result, analysis) for result in analysis.faults}


def test_the_list_is_worst_first(analysis: Analysis, tree: Tree) -> None:
    rows = [analysis.faults[int(row["data-fault"])].verdict for row in tree.of("button", class_="fault")]
    order = [("conflicting", "undetermined", "consistent").index(verdict.word) for verdict in rows]
    assert order == sorted(order)
    chances = [round(v.conflict_probability or 0, 2) for v in rows if v.word == "conflicting"]
    assert chances == sorted(chances, reverse=True)


def test_ids_are_distinct_and_links_lead_somewhere(tree: Tree) -> None:
    ids = Counter(e["id"] for e in tree.elements if e.get("id"))
    assert not [key for key, times in ids.items() if times > 1]
    assert not [e["href"] for e in tree.of("a") if e["href"][1:] not in ids]


def test_the_answer_tells_how_many_conflict(analysis: Analysis, tree: Tree) -> None:
    said = tree.of("p", class_="said")[0]["text"]
    assert said.startswith(f"{len(analysis.conflicting)} of {len(analysis.faults)} faults conflict")
    assert how_sure(analysis) in said


def test_a_model_without_a_stress_still_has_its_page(no_stress: Analysis) -> None:
    tree = Tree(page_text(no_stress, pictures={}))
    assert tree.of("h1")[0]["text"] == "No stress could be inferred"
    assert "No fault of 2 conflicts" in verdict_line(no_stress)
    assert not tree.of("section", class_="conflicts")[0]["text"].count("worst first")
    assert len(tree.of("button", class_="fault")) == 2


def test_only_what_ran_is_cited(analysis: Analysis) -> None:
    assert "vavrycuk2014" not in sources_of(analysis)
    quake = Mechanism("one", (0.0, 0.0, 0.0), ((0.0, 90.0, 0.0),))
    assert "vavrycuk2014" in sources_of(replace(analysis, model=replace(analysis.model, mechanisms=(quake,))))
    assert set(sources_of(analysis)) == {k for m in methods_of(analysis) for k in CITED.findall(m.text)}


@pytest.mark.parametrize("method", METHODS, ids=lambda method: method.title)
def test_every_source_is_known(method: object) -> None:
    assert set(CITED.findall(method.text)) <= set(REFERENCES)  # type: ignore[attr-defined]


@pytest.mark.parametrize("key", REFERENCES)
def test_sources_have_a_short_name(key: str) -> None:
    assert re.fullmatch(r"\S.* \d{4}", short_source(key))
    assert short_source(key)[-4:] == re.sub(r"\D", "", key)


def picture(width: int) -> bytes:
    held = io.BytesIO()
    Image.new("RGB", (width, width // 2), "#884422").save(held, "PNG")
    return held.getvalue()


def test_a_picture_is_held_small(analysis: Analysis) -> None:
    tree = Tree(page_text(analysis, pictures={"scene.png": picture(2400)}))
    image = next(e for e in tree.of("img") if "3D" in e["alt"])
    held = Image.open(io.BytesIO(base64.b64decode(image["src"].partition(",")[2])))
    assert held.size == (page.PICTURE_WIDTH, page.PICTURE_WIDTH // 2) == (int(image["width"]), int(image["height"]))


def test_a_picture_that_cannot_be_read_is_told_missing(analysis: Analysis) -> None:
    assert "No picture was drawn" in page_text(analysis, pictures={"scene.png": b"nothing"})


def test_a_served_page_may_ask_where_it_came_from(analysis: Analysis) -> None:
    tree = Tree(page_text(analysis, pictures={}, live=live_script("a-1")))
    policy = next(e["content"] for e in tree.of("meta") if e.get("http-equiv") == "Content-Security-Policy")
    assert policy.endswith("connect-src 'self'")
    assert 'const VERSION = "a-1"' in tree.of("script", data_part="live")[0]["text"]


def test_a_notice_shows_its_text_as_text() -> None:
    tree = Tree(notice_page("Broken <b>", "line one\nline <i>two</i>", live="//"))
    assert tree.of("h1")[0]["text"] == "Broken <b>"
    assert tree.of("p", class_="lines")[0]["text"] == "line one\nline <i>two</i>"


def test_markup_escapes_whatever_is_not_markup() -> None:
    assert element("p", "<", element("b", "&")) == "<p>&lt;<b>&amp;</b></p>"
    assert joined(["<", given('"')]) == "&lt;<bdi>&quot;</bdi>"
    assert element("p", title='"><script>') == '<p title="&quot;&gt;&lt;script&gt;"></p>'
    assert table(("a",), [("<1",)], numeric=(0,)).count('class="n"') == 2


def luminance(colour: str) -> float:
    parts = [int(colour[k : k + 2], 16) / 255 for k in (1, 3, 5)]
    r, g, b = (c / 12.92 if c <= 0.04045 else ((c + 0.055) / 1.055) ** 2.4 for c in parts)
    return 0.2126 * r + 0.7152 * g + 0.0722 * b


def contrast(one: str, other: str) -> float:
    light, dark = sorted((luminance(one), luminance(other)), reverse=True)
    return (light + 0.05) / (dark + 0.05)


def colours(scheme: str) -> dict[str, str]:
    """Return the colours by variable as they hold in the light, the dark, or on paper."""
    style = files("structviz.report").joinpath("templates/page.css").read_text("utf-8")
    named = {"paper": palette.PAPER, "ink": palette.INK, "faint": palette.FAINT}
    blocks = re.findall(r":root \{(.*?)\}", style, re.S)
    assert len(blocks) == 3
    for block in blocks[:1] + {"light": [], "dark": blocks[1:2], "print": blocks[2:]}[scheme]:
        named |= dict(re.findall(r"--([\w-]+): (#\w+)", block))
    return {key: value if len(value) == 7 else "#" + "".join(2 * c for c in value[1:]) for key, value in named.items()}


@pytest.mark.parametrize("scheme", ["light", "dark", "print"])
@pytest.mark.parametrize("text", ["ink", "quiet", "conflicting-text", "undetermined-text", "consistent-text", "focus"])
def test_text_stands_out(scheme: str, text: str) -> None:
    known = colours(scheme)
    assert min(contrast(known[text], known[ground]) for ground in ("paper", "raised", "wash")) >= 4.5


def test_what_the_answer_depends_on_is_told_where_asked(analysis: Analysis) -> None:
    names = [result.fault.name for result in analysis.faults]
    words = {result.fault.name: result.verdict.word for result in analysis.faults}
    base = Scenario("base", "as chosen", words, "normal", 12.0)
    other = Scenario("friction_angle", "friction angle 20 deg", {**words, names[0]: "undetermined"}, "", float("nan"))
    carried = tuple(
        Influence(np.full((len(names), 3), 2.0), np.zeros(len(names)), np.zeros(len(names))) for _ in (analysis.regimes or [None])
    )
    told = (Dependence(names[0], ("friction_angle",), "consistent as chosen; undetermined with friction angle 20 deg"),)
    tree = Tree(page_text(analysis, pictures={}, depends=Sensitivity(base, (other,), told, carried, np.zeros(0))))
    part = tree.of("section", class_="sensitivity")[0]["text"]
    assert "1 other choice tried: 1 verdict depends on one of them." in part
    assert f"{printable(names[0])}: consistent as chosen; undetermined with friction angle 20°." in part
    assert "2.0°" in part
    assert not Tree(page_text(analysis, pictures={})).of("section", class_="sensitivity")


def test_the_3d_view_and_plots_take_their_places(analysis: Analysis, monkeypatch: pytest.MonkeyPatch) -> None:
    stand_ins = {
        "page_data": lambda analysis: ({"title": "</script><b>"}, b"\x00\xff"),
        "viewer_script": lambda: "const end = '</script>';",
        "net_svg": lambda analysis: '<svg><path data-fault="0"></path></svg>',
    }
    monkeypatch.setattr(page, "_optional", lambda module, name: stand_ins.get(name))
    tree = Tree(page_text(analysis, pictures={}))
    assert json.loads(tree.of("script", id="structviz-data")[0]["text"]) == {"title": "</script><b>"}
    assert base64.b64decode(tree.of("script", id="structviz-arrays")[0]["text"]) == b"\x00\xff"
    assert tree.of("script", data_part="viewer")[0]["text"] == r"const end = '<\/script>';"
    assert [e["data-plot"] for e in tree.of("figure")] == ["net"]


def test_without_the_3d_view_its_data_are_left_out(analysis: Analysis, monkeypatch: pytest.MonkeyPatch) -> None:
    stand_ins = {"page_data": lambda analysis: ({"title": "t"}, b"\x00" * 3000), "viewer_script": lambda: None}
    monkeypatch.setattr(page, "_optional", lambda module, name: stand_ins.get(name))
    tree = Tree(page_text(analysis, pictures={}))
    assert tree.of("script", id="structviz-data")[0]["text"] == "{}"
    assert tree.of("script", id="structviz-arrays")[0]["text"] == ""
    assert not tree.of("script", data_part="viewer")


def test_very_many_undetermined_faults_are_told_in_the_table(no_stress: Analysis) -> None:
    many = tuple(replace(no_stress.faults[0], fault=replace(no_stress.faults[0].fault, name=f"f{k}")) for k in range(45))
    tree = Tree(page_text(replace(no_stress, faults=many), pictures={}))
    assert "5 more are in the table of every fault." in tree.of("section", class_="open")[0]["text"]
    assert len(tree.of("article", class_="card")) == 45
