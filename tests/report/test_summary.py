"""The summary: answers first, within the width, and nothing of a user's text is taken for an instruction."""

from __future__ import annotations

import io
import re
from dataclasses import replace
from pathlib import Path

import pytest
from rich.cells import cell_len
from rich.console import Console

from structviz.analysis import Analysis
from structviz.model import Finding
from structviz.report.summary import middle_cut, show
from structviz.report.write import Written
from structviz.stress.regime import ShapeRatio
from structviz.stress.verdict import Cause, Verdict

SGR = re.compile(r"\x1b\[[0-9;]*m")  # colours and weights, the only sequences we send
COLOUR = re.compile(r"\x1b\[[0-9;]*(3[0-7]|9[0-7])[0-9;]*m")


def shown(analysis: Analysis, width: int = 80, *, terminal: bool = False, written: Written | None = None) -> str:
    """Return the summary as text."""
    held = io.StringIO()
    console = Console(file=held, width=width, force_terminal=terminal, color_system="standard" if terminal else None, emoji=False)
    show(console, analysis, written)
    return held.getvalue()


def crowded(analysis: Analysis, count: int) -> Analysis:
    """Return the analysis with its faults repeated under new names up to a count, all of them conflicting or loose in turn."""
    words = [
        Verdict("conflicting", 0.99, 150.0, -80.0, 5.0, 0.9, ("declared otherwise",)),
        *(Verdict("undetermined", 0.5, 80.0, -80.0, 5.0, 0.9, (f"reason number {k}: fault by fault (as told)",)) for k in "abcdefgh"),
    ]
    faults = [
        replace(analysis.faults[k % 9], fault=replace(analysis.faults[k % 9].fault, name=f"fault {k}"), verdict=words[k % 9])
        for k in range(count)
    ]
    findings = tuple(
        Finding(f"check-{k}", ("error", "warning", "note")[k % 3], ("model", "fault 1", "fault 2")[k // 3 % 3], "words " * 60)
        for k in range(60)
    )
    return replace(analysis, faults=tuple(faults), findings=findings)


@pytest.mark.parametrize("width", [60, 80, 120])
@pytest.mark.parametrize("terminal", [False, True])
def test_no_line_is_wider_than_the_terminal(analysis: Analysis, width: int, terminal: bool) -> None:
    for given in (analysis, crowded(analysis, 40)):
        lines = SGR.sub("", shown(given, width, terminal=terminal)).splitlines()
        assert max(map(cell_len, lines)) <= width


@pytest.mark.parametrize("count", [9, 40, 400])
def test_it_fits_a_page_however_many_faults_there_are(analysis: Analysis, count: int) -> None:
    assert len(shown(crowded(analysis, count)).splitlines()) <= 62


def test_an_ordinary_model_takes_forty_lines_at_most(analysis: Analysis, no_stress: Analysis) -> None:
    assert len(shown(analysis).splitlines()) <= 40
    assert len(shown(no_stress).splitlines()) <= 40


def test_the_regime_comes_first_then_the_conflicts(analysis: Analysis) -> None:
    lines = shown(analysis, 120).splitlines()
    regime = analysis.regimes[0]
    assert lines[2].strip().startswith(f"{regime.kind.upper()} stress   SHmax {round(regime.shmax_deg) % 180:03d} ± ")
    assert lines[3].strip().startswith("sigma1 ")
    assert f"± {regime.cones_deg[2]:.0f}°" in lines[3]
    conflict = next(line for line in lines if "conflict" in line and "with the others" in line)
    assert conflict.startswith(f"{len(analysis.conflicting)} of {len(analysis.faults)} faults")
    assert lines.index(conflict) < next(k for k, line in enumerate(lines) if "consistent" in line)
    for result in analysis.conflicting:
        row = next(line for line in lines if line.strip().startswith(middle_cut(result.fault.name, 20)[:4]))
        assert result.fault.declared is not None
        assert result.fault.declared.text in row


@pytest.mark.parametrize(
    ("azimuth", "want"), [(0.2, "000 ± 5° (N-S)"), (179.9, "000 ± 5° (N-S)"), (135.0, "135 ± 5° (NW-SE)"), (90.0, "090 ± 5° (E-W)")]
)
def test_shmax_has_its_compass_points(analysis: Analysis, azimuth: float, want: str) -> None:
    regime = replace(analysis.regimes[0], shmax_deg=azimuth, shmax_half_width_deg=5.0)
    assert f"SHmax {want}" in shown(replace(analysis, regimes=(regime,)))


def test_r_is_told_in_both_cases(analysis: Analysis) -> None:
    def with_ratio(ratio: ShapeRatio | None) -> str:
        return shown(replace(analysis, regimes=(replace(analysis.regimes[0], shape_ratio=ratio),)))

    assert "R is not resolved: predictions cover all of it" in with_ratio(None)
    assert "R = 0.40 (0.30 to 0.55), resolved" in with_ratio(ShapeRatio(0.4, 0.3, 0.55))


def test_a_loose_regime_is_not_dressed_up(analysis: Analysis) -> None:
    assert "poorly determined" not in shown(analysis)
    loose = replace(analysis, regimes=(replace(analysis.regimes[0], cones_deg=(50.0, 50.0, 10.0)),))
    assert "poorly determined" in shown(loose)


def test_without_stress_it_claims_nothing(no_stress: Analysis) -> None:
    text = shown(no_stress)
    assert "No stress could be inferred" in text
    assert "No fault could be judged" in text
    assert "consistent" not in text.split("undetermined")[0]
    assert re.search(r"2 undetermined:\n +2  no ", text)


def test_a_model_without_conflicts_says_so(analysis: Analysis) -> None:
    calm = replace(analysis, faults=tuple(result for result in analysis.faults if result.verdict.word == "consistent"))
    assert f"None of the {len(calm.faults)} judged faults conflicts with the others" in shown(calm)


def test_readings_that_failed_say_why(no_stress: Analysis) -> None:
    assert "geometry only: none; no two faults stand at an admissible angle" in shown(no_stress, 200)


def test_undetermined_faults_are_grouped_by_reason(analysis: Analysis) -> None:
    reasons = ("no movement is declared", "the slip is near the edge of the declared sector (40 % outside it)",
               "the slip is near the edge of the declared sector (60 % outside it)")  # fmt: skip
    faults = [
        replace(result, verdict=Verdict("undetermined", None, None, None, None, None, (reason,)))
        for result, reason in zip(analysis.faults, reasons)
    ]
    text = shown(replace(analysis, faults=(*faults, *analysis.faults[3:])))
    assert re.search(r"2  no movement is declared: ", text)
    assert re.search(r"2  the slip is near the edge of the declared sector: ", text)


@pytest.mark.parametrize("width", [80, 200])
def test_text_of_users_is_never_an_instruction(analysis: Analysis, width: int) -> None:
    every = [Verdict("conflicting", 1.0, 170.0, -80.0, 5.0, 0.9, ("[bold]why\x1b[5m",)) for _ in range(10)]
    faults = tuple(replace(result, verdict=verdict) for result, verdict in zip(analysis.faults, every))
    hostile = replace(
        analysis, faults=faults, findings=tuple(Finding("import", "warning", s, "[blink]\x1b[2J\x07") for s in ("model", "\x1b]0;x\x07"))
    )
    for terminal in (False, True):
        text = shown(hostile, width, terminal=terminal)
        assert not [letter for letter in SGR.sub("", text) if letter < " " and letter != "\n"]
        assert "\u202e" not in text
        plain = SGR.sub("", text)
        assert "[bold]hostile\ufffd[0m" in plain
        assert "[red]marked[/red]" in plain
        assert "[blink]\ufffd[2J\ufffd" in plain
    assert not SGR.search(shown(hostile, width))


def test_colours_only_where_they_are_wanted(analysis: Analysis, monkeypatch: pytest.MonkeyPatch) -> None:
    assert COLOUR.search(shown(analysis, terminal=True))
    monkeypatch.setenv("NO_COLOR", "1")
    assert not COLOUR.search(shown(analysis, terminal=True))


def test_it_says_where_the_outputs_are(analysis: Analysis) -> None:
    assert "add --out DIR" in shown(analysis)
    written = Written(Path("place"), ("results.json", "faults.csv", "faults/a.vtp", "faults/b.vtp"), ("scene.png: no OpenGL [x]",))
    text = shown(analysis, 120, written=written)
    assert "Written to place: results.json, faults.csv, and 2 meshes in faults/" in text
    assert "scene.png: no OpenGL [x]" in text


def test_a_long_name_keeps_both_ends() -> None:
    assert middle_cut("short", 10) == "short"
    cut = middle_cut("MJVA-CREC-EMRS-Emerson_fault-CFM5", 16)
    assert len(cut) == 16
    assert cut.startswith("MJVA")
    assert cut.endswith("CFM5")


def test_what_to_do_next_is_told_once_a_cause(analysis: Analysis) -> None:
    cause = Cause("older_phase", "the fault may be older", 0.7, "look for what dates it")
    verdict = Verdict("conflicting", 0.99, 150.0, -80.0, 5.0, 0.9, ("declared otherwise",), (cause,))
    faults = tuple(replace(result, verdict=verdict) for result in analysis.faults[:3])
    text = shown(replace(analysis, faults=faults))
    assert text.count("older phase: look for what dates it") == 1
