"""report.html: one file that opens from disk with no network, in which the argument for each flag can be followed by eye.

The same analysis and pictures give the same bytes. No address to load anything from stands in it, and a Content-Security-Policy lets
no request out and no script run but the ones put in here, each known by its hash.
"""

from __future__ import annotations

import base64
import hashlib
import importlib
import io
import json
from collections.abc import Callable, Mapping
from importlib.resources import files
from string import Template
from typing import Any

from structviz.analysis import Analysis
from structviz.report import page_words as words
from structviz.report.markup import Markup, element, joined, plain
from structviz.report.page_argument import argument, contents, parts_of
from structviz.report.page_parts import answer, fault_list, other_cards, plain_lines, why_whole
from structviz.report.svg.compact import compact
from structviz.scenarios import Sensitivity
from structviz.views import palette
from structviz.views.stereonet import build_net

PICTURE_WIDTH = 1100  # pixels; enough for a page of A4 at 150 dots an inch
JPEG_QUALITY = 76
PLOTS = (
    ("net_svg", "net", "Planes, slip and axes, equal area, lower hemisphere"),
    ("mohr_svg", "mohr", "Shear over normal stress"),
    ("plunges_svg", "plunges", "Plunges of the axes"),
    ("rose_svg", "rose", "Strikes by area"),
    ("misfits_svg", "misfits", "Declared against predicted slip"),
    ("reliability_svg", "reliability", "What the probabilities mean, on synthetic models"),
)


def page_text(analysis: Analysis, *, pictures: Mapping[str, bytes], depends: Sensitivity | None = None, live: str = "") -> str:
    """Return report.html as text. `pictures` are PNG files by name, those of `views`; a page without them says so.

    `depends` is what the verdicts depend on, where that was asked. `live` is a script for pages that are served: it alone may ask,
    and only where the page came from.
    """
    parts = parts_of(analysis, depends)
    viewer = _optional("structviz.report.page_data", "viewer_script")
    bundle = (viewer() if viewer else None) or ""
    data, arrays = _scene_data(analysis) if bundle else ({}, "")  # without the 3D view nothing reads them
    scripts = {"page": _template("page.js"), "viewer": _whole(bundle), "live": live}  # the page first: it gives the 3D view its room
    slots = {
        "policy": _policy(scripts.values(), asks=bool(live)),
        "title": plain(f"{words.headline(analysis)} – {analysis.model.title or 'structviz'}"),
        "style": _style(),
        "answer": joined(answer(analysis), contents(parts)),
        "shared": why_whole(analysis),
        "list": fault_list(analysis),
        "scene_picture": _picture(pictures.get("scene.png"), "The faults in 3D, coloured by verdict, with the stress as glyphs"),
        "net": _plot(analysis, *PLOTS[0], instead=pictures.get("net.png"), note=_crowding(analysis)),
        "plots": joined([_plot(analysis, *each) for each in PLOTS[1:]]),
        "argument": argument(parts),
        "records": joined(other_cards(analysis)),
        "data": _in_script(json.dumps(data, ensure_ascii=False, sort_keys=True, separators=(",", ":"), allow_nan=False)),
        "arrays": arrays,
        "scripts": "".join(_script(name, text) for name, text in scripts.items() if text),
    }
    return Template(_template("page.html")).substitute(slots)


def live_script(version: str) -> str:
    """Return the script of a page that is served, which asks whether there is a newer version than this one."""
    return Template(_template("live.js")).substitute(version=version)


def notice_page(title: str, text: str, *, live: str) -> str:
    """Return a page that says one thing, and waits for the next."""
    lines = element("p", plain_lines(text), class_="said lines")
    slots = {
        "policy": _policy([live], asks=True),
        "title": plain(f"{title} – structviz"),
        "style": _style(),
        "body": element("main", element("h1", title), lines, class_="notice"),
        "scripts": _script("live", live),
    }
    return Template(_template("notice.html")).substitute(slots)


def _optional(module: str, name: str) -> Callable[..., Any] | None:
    """Return a function of the 3D view or of the plots, or None in an installation made without them."""
    try:
        return getattr(importlib.import_module(module), name, None)
    except ModuleNotFoundError:
        return None


def _scene_data(analysis: Analysis) -> tuple[dict[str, Any], str]:
    """Return what the 3D view draws: a description, and its arrays as base64."""
    make = _optional("structviz.report.page_data", "page_data")
    data, arrays = make(analysis) if make else ({}, b"")
    return data, base64.b64encode(arrays).decode("ascii")


def _template(name: str) -> str:
    return files("structviz.report").joinpath("templates", name).read_text(encoding="utf-8")


def _policy(scripts: Any, *, asks: bool) -> str:
    """Return the Content-Security-Policy: nothing may be loaded, and only these scripts may run."""
    hashes = [base64.b64encode(hashlib.sha256(text.encode()).digest()).decode() for text in scripts if text]
    run = " ".join(f"'sha256-{digest}'" for digest in hashes) or "'none'"
    rules = [
        "default-src 'none'",
        f"script-src {run}",
        "style-src 'unsafe-inline'",
        "img-src data: blob:",
        "base-uri 'none'",
        "form-action 'none'",
    ]
    return "; ".join([*rules, "connect-src 'self'"] if asks else rules)


def _script(name: str, text: str) -> str:
    return f'<script type="module" data-part="{name}">{text}</script>\n'


def _whole(script: str) -> str:
    r"""Return a script in which nothing ends the element it stands in; in strings and patterns of JavaScript the stroke changes nothing.

    >>> _whole("a='</script>'")
    "a='<\\/script>'"
    """
    return script.replace("</script", "<\\/script").replace("<!--", "<\\!--")


def _in_script(text: str) -> str:
    r"""Return JSON that cannot end the element it stands in, nor hold half a surrogate pair.

    >>> _in_script('{"a":"</script>"}')
    '{"a":"\\u003c/script>"}'
    """
    return text.replace("<", "\\u003c").encode("utf-8", "backslashreplace").decode("utf-8")


def _style() -> str:
    """Return the style of a page: colours of the pictures as variables, ours, and on paper those of the pictures again."""
    lines = {"paper": palette.PAPER, "ink": palette.INK, "faint": palette.FAINT, "hair": palette.HAIR}
    marks = {word: look.colour for word, look in palette.VERDICTS.items()} | {f"sigma{k}": c for k, c in enumerate(palette.SIGMA, 1)}
    marks |= palette.GLYPH
    return f"{_variables(lines | marks)}\n{_template('page.css')}@media print {{ {_variables(marks)} }}\n"


def _variables(colours: Mapping[str, str]) -> str:
    return ":root { " + " ".join(f"--{name}: {colour};" for name, colour in colours.items()) + " }"


def _picture(png: bytes | None, alt: str) -> Markup:
    """Return a picture as an element that holds it, made small; a sentence where there is none."""
    small = _small(png) if png else None
    if small is None:
        return element("p", "No picture was drawn when this page was made.", class_="missing")
    data, width, height = small
    return element("img", src=f"data:image/jpeg;base64,{base64.b64encode(data).decode()}", alt=alt, width=width, height=height)


def _small(png: bytes) -> tuple[bytes, int, int] | None:
    """Return a picture as JPEG no wider than the page can show, with its width and height; None where it cannot be read."""
    from PIL import Image

    try:
        image = Image.open(io.BytesIO(png)).convert("RGB")
    except (OSError, ValueError):
        return None
    if image.width > PICTURE_WIDTH:
        image = image.resize((PICTURE_WIDTH, round(image.height * PICTURE_WIDTH / image.width)), Image.Resampling.LANCZOS)
    held = io.BytesIO()
    image.save(held, "JPEG", quality=JPEG_QUALITY, optimize=True, progressive=True)
    return held.getvalue(), image.width, image.height


def _crowding(analysis: Analysis) -> str:
    """Return what the shades of the net mean, where it has any."""
    density = build_net(analysis).density
    return f". Shaded where poles crowd: {words.listed([f'{level:g}' for level in density.levels])} s.d. above chance" if density else ""


def _plot(analysis: Analysis, function: str, key: str, caption: str, *, instead: bytes | None = None, note: str = "") -> Markup:
    """Return a plot as a figure, or a picture in its place, or nothing."""
    make = _optional("structviz.report.svg", function)
    drawn = Markup(compact(make(analysis))) if make else _picture(instead, caption) if instead else None
    if not drawn:
        return Markup("")
    return element("figure", drawn, element("figcaption", caption + note), class_=f"plot {key}", data_plot=key)
