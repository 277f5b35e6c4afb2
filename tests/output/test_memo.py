"""Memos by their text against the data, their structure, their bytes, and their refusals."""

import json
import re
import shutil
import sys
import zipfile
from copy import copy
from dataclasses import replace
from datetime import date, timedelta
from pathlib import Path

import numpy as np
import pytest
from docx import Document
from pypdf import PdfReader

from causticload.cli import DONE, WRONG_INPUT, main
from causticload.errors import InputError, ResultError
from causticload.hazard.findings import ObserverFinding, Sight
from causticload.hazard.seasons import worth_a_close_look
from causticload.output import words
from causticload.output.memo import phrases, write_memo
from causticload.output.memo import write as memo_write
from causticload.output.memo.blocks import (
    Bullets,
    Heading,
    Memo,
    Picture,
    Table,
    number,
    ref,
    spans,
)
from causticload.output.memo.compose import compose
from causticload.output.memo.evidence import Evidence
from causticload.output.memo.findings import gather, join_spans, need_of, peak_of
from causticload.output.memo.results import observers
from causticload.worker.listing import write_memo as write_memo_for_host

sys.path.insert(0, str(Path(__file__).parent))
from conftest import NOW


@pytest.fixture(scope="module")
def evidence(steel_year):
    return Evidence(steel_year)


@pytest.fixture(scope="module")
def summary(steel_year):
    return json.loads((steel_year / "summary.json").read_text())


@pytest.fixture(scope="module")
def docx_text(memo_files):
    word = Document(memo_files.docx)
    cells = [c.text for t in word.tables for r in t.rows for c in r.cells]
    return "\n".join([p.text for p in word.paragraphs] + cells)


@pytest.fixture(scope="module")
def pdf_text(memo_files):
    text = "\n".join(p.extract_text() for p in PdfReader(memo_files.pdf).pages)
    return " ".join(text.split())


def all_text(blocks):
    for b in blocks:
        if isinstance(b, Bullets):
            yield from b.items
        elif isinstance(b, Table):
            yield b.caption
            yield from (c for row in b.rows for c in row)
        elif hasattr(b, "text"):
            yield b.text
        else:
            yield b.caption


# --- the text against the data --------------------------------------------------------------------


def test_findings_tell_what_the_summary_holds(summary, docx_text, pdf_text):
    checked = [e for e in summary["episodes"] if e["check"]]
    assert checked
    told = 0
    for text in (docx_text, pdf_text):
        for receiver in {e["receiver"] for e in checked}:
            mine = [e for e in checked if e["receiver"] == receiver]
            c = max(mine, key=lambda e: e["check"]["total"])["check"]
            flat = " ".join(text.split())
            assert f"{words.load(c['total'])} (total irradiance" in flat
            assert f"{words.load(c['reflected'])} of it by reflection" in flat
            x, y, z = (round(v, 1) + 0.0 for v in c["place"])
            assert f"x {x:.1f}, y {y:.1f}, z {z:.1f} m" in flat
            assert f"azimuth {c['sun_azimuth']:.0f}°" in flat
            assert f"{c['count_mean']:,.0f} ± {c['count_error']:,.0f}" in flat
            told += 1
    assert told >= 2


def test_limit_tables_tell_minutes_and_days_of_the_summary(evidence, summary):
    """Days and minutes are worked out again from the raw records, in another way."""
    by_name = {r["name"]: r for r in summary["receivers"]}
    checked = 0
    for f in gather(evidence.year):
        for facts in f.limits:
            mine = [
                e
                for e in summary["episodes"]
                if e["receiver"] == f.receiver and e["criterion"] == facts.criterion["name"]
            ]
            assert facts.days == pytest.approx(sum({e["day"]: e["days"] for e in mine}.values()))
            over = by_name[f.receiver]["over"][facts.criterion["name"]]
            assert facts.place_minutes_per_year == over["most_minutes_per_year"]
            assert facts.area == over["area_m2"]
            longest = 0
            for day in {e["day"] for e in mine}:
                minutes = set()
                for e in mine:
                    if e["day"] == day:
                        a, b = (
                            np.datetime64(e[k].rstrip("Z"), "m").astype(int)
                            for k in ("start", "end")
                        )
                        minutes |= set(range(a, b))
                longest = max(longest, len(minutes))
            # starts and ends are told to the second: a minute may be lost at each end
            assert facts.minutes_per_day == pytest.approx(longest, abs=2.0)
            checked += 1
    assert checked >= 2


def test_contributor_tables_hold_the_panels_of_the_summary(memo_files, summary):
    word = Document(memo_files.docx)
    heads = {t.rows[0].cells[0].text: t for t in word.tables if len(t.columns) == 6}
    rows = [[c.text for c in r.cells] for r in heads["Panel"].rows[1:]]
    assert rows
    known = {
        (str(c["panel"]), f"{c['load']:,.0f}", f"{100 * c['share']:.1f} %")
        for e in summary["episodes"]
        for c in e["contributors"]
    }
    assert {(r[0], r[3], r[4]) for r in rows} <= known


def test_the_same_findings_stand_in_all_three(memo_files, docx_text, pdf_text):
    page = memo_files.html.read_text()
    for f in gather(Evidence(memo_files.folder).year):
        for text in (" ".join(docx_text.split()), pdf_text, page):
            assert words.load(peak_of(f.main).value) in text
    for text in (docx_text, pdf_text, page):
        assert "Local codes and licensed practice decide" in text
        assert phrases.TO_FILL in text


def test_user_texts_are_not_taken_for_markup(memo_files, docx_text, pdf_text):
    for text in (docx_text, pdf_text):
        assert "Curved wall <one> & only" in text
    assert "Curved wall &lt;one&gt; &amp; only" in memo_files.html.read_text()


def test_no_output_promises_safety(memo_files, docx_text, pdf_text):
    page = re.sub(
        r"base64,[A-Za-z0-9+/=]+|<script.*?</script>", "", memo_files.html.read_text(), flags=re.S
    )
    for text in (docx_text, pdf_text, page):
        assert not re.search(r"\b(un)?saf(e|ely|ety)\b", text, re.I)


def test_inputs_and_settings_are_in_the_appendix(summary, docx_text, pdf_text):
    for text in (docx_text, pdf_text.replace(" ", "")):
        for name, digest in summary["inputs_sha256"].items():
            assert name in text
            assert digest in text
    assert 'finish = "polished stainless steel"' in docx_text
    assert f"numpy\n{np.__version__}" in docx_text


def test_a_year_without_exceedance_says_so(evidence):
    quiet = with_year(evidence, episodes=[], seasons=[])
    memo = compose(quiet, now=NOW)
    text = "\n".join(all_text([*memo.summary, *memo.blocks]))
    assert words.NO_EXCEEDANCE in text
    assert "no measure follows" in text
    none = next(b for b in memo.blocks if isinstance(b, Table) and b.key == "tab-none")
    assert len(none.rows) == sum(len(c["receivers"]) for c in evidence.summary["criteria"])


SIGHT = Sight(
    time=np.datetime64("2025-03-21T09:30:00"),
    place=(1.0, -12.0, 1.6),
    images=2,
    subtense_mrad=9.0,
    corneal=300.0,
    retinal=12345.0,
    after_image_limit=777.0,
    burn_limit=99999.0,
    eye_class=1,
    illuminance=23456.0,
    veil=432.0,
    rogue_veil=500.0,
    contrast_left=0.37,
    angle_deg=12.0,
    azimuth_deg=10.0,
    elevation_deg=5.0,
)
OBSERVER = ObserverFinding(
    name="gate",
    points=3,
    age=50.0,
    after_image_days=41.0,
    after_image_minutes=615.0,
    after_image_most=25.0,
    worst_day=date(2025, 3, 21),
    burn_minutes=0.0,
    rogue_minutes=333.0,
    spans=((date(2025, 3, 1), date(2025, 4, 10)),),
    clock=("09:10", "10:05"),
    daily=(),
    worst=SIGHT,
)


def with_year(evidence, **parts):
    """The same evidence with parts of its year replaced."""
    other = copy(evidence)
    other.year = replace(evidence.year, **parts)
    return other


def test_observers_are_told_when_the_run_has_them(evidence):
    without = "\n".join(all_text(observers(with_year(evidence, observers=[]))))
    assert "gate" in without
    assert "not assessed in this run" in without
    rows = [OBSERVER, replace(OBSERVER, worst=None)]
    text = "\n".join(all_text(observers(with_year(evidence, observers=rows))))
    for part in ("41", "615; 25", "333", "1 March to 10 April", "09:10 to 10:05", "12,345", "777"):
        assert part in text
    assert "21 March 2025, 09:30 (UTC+00:00)" in text
    assert "37 % of contrast" in text
    assert "no after-image found under these assumptions" in text


def test_the_years_own_observer_is_told(evidence, summary, docx_text):
    (gate,) = summary["observers"]
    row = f"{gate['after_image_minutes']:.0f}; {gate['after_image_most']:.0f}"
    assert row in docx_text
    if gate["worst"]:
        assert f"{gate['worst']['illuminance']:,.0f} lx" in docx_text


def test_what_a_season_worked_out_is_told(evidence, summary, docx_text):
    flat = " ".join(docx_text.split())
    told = 0
    for f in gather(evidence.year):
        own = next((r for r in summary["findings"] if r["season"] == f.main.season), None)
        if own is None:
            continue
        told += 1
        for part in ("least_panels", "skin", "surface"):
            if own[part]:
                assert " ".join(own[part]["text"].split()) in flat
        for reason in own["confidence"]["reasons"]:
            assert " ".join(reason.split()) in flat
    assert told >= 1
    bare = with_year(evidence, findings={}, histories={})
    text = "\n".join(all_text(compose(bare, now=NOW).blocks))
    assert phrases.WHY_COUNTED in text


def test_a_temperature_history_is_drawn(evidence):
    memo = compose(evidence, now=NOW)
    charts = [b for b in memo.blocks if getattr(b, "key", "").startswith("fig-temperature")]
    assert len(charts) == sum(
        f.main.season in evidence.year.histories for f in gather(evidence.year)
    )
    for chart in charts:
        number_of = int(chart.key.rsplit("-", 1)[1])
        finding = gather(evidence.year)[number_of - 1]
        history = evidence.year.histories[finding.main.season]
        axes = chart.draw().axes[0]
        assert axes.get_ylabel() == "surface temperature (°C)"
        assert axes.lines[0].get_ydata() == pytest.approx(history.surface_c)


# --- what it is made of ---------------------------------------------------------------------------


def test_docx_has_styles_captions_and_live_references(memo_files, evidence):
    word = Document(memo_files.docx)
    memo = compose(evidence, now=NOW)
    blocks = [*memo.summary, *memo.blocks]
    figures = sum(isinstance(b, Picture) for b in blocks)
    tables = sum(isinstance(b, Table) for b in blocks)
    used = {p.style.name for p in word.paragraphs}
    assert {"Title", "Subtitle", "Heading 1", "Heading 2", "Caption", "List Bullet"} <= used
    assert len(word.inline_shapes) == figures
    assert len(word.tables) == tables + 1  # and the title block
    xml = word.element.xml
    assert len(re.findall(r"SEQ Figure", xml)) == figures
    assert len(re.findall(r"SEQ Table", xml)) == tables
    names = re.findall(r'bookmarkStart[^>]*w:name="(\w+)"', xml)
    targets = re.findall(r"REF (\w+) ", xml)
    assert targets
    assert set(targets) <= set(names)
    assert len(set(names)) == len(names)
    assert all(s._inline.docPr.get("descr") for s in word.inline_shapes)


def test_pdf_has_an_outline_and_vector_figures(memo_files, evidence):
    reader = PdfReader(memo_files.pdf)
    memo = compose(evidence, now=NOW)
    titles = [o.title for o in reader.outline if not isinstance(o, list)]
    assert len(titles) == sum(isinstance(b, Heading) and b.level == 1 for b in memo.blocks)
    forms = {
        name
        for page in reader.pages
        for name, form in page["/Resources"].get("/XObject", {}).items()
        if form.get_object()["/Subtype"] == "/Form"
    }
    assert forms == {f"/{b.key}" for b in memo.blocks if isinstance(b, Picture)}
    # words of a figure are text in the page: it was not turned into pixels
    assert "local clock time (h)" in " ".join(p.extract_text() for p in reader.pages)
    assert reader.metadata.title == f"{memo.title}. {memo.subtitle}"


def test_html_asks_for_nothing(memo_files):
    page = memo_files.html.read_text()
    assert "default-src 'none'" in page
    outside = re.findall(r"""(?:src|href)=["'](?!data:|#)([^"']*)""", page)
    assert outside == []
    assert "fetch(" not in page
    assert "XMLHttpRequest" not in page


def test_figures_are_kept_beside_the_memo(memo_files, evidence):
    kept = {p.name for p in (memo_files.folder / "figures" / "memo").iterdir()}
    memo = compose(evidence, now=NOW)
    for b in memo.blocks:
        if isinstance(b, Picture):
            for kind in ("svg", "pdf", "png"):
                assert f"{b.key.removeprefix('fig-')}.{kind}" in kept


def test_numbers_follow_the_order_on_paper():
    blocks = [
        Heading(1, "a", "a"),
        Table("t", "", (), ()),
        Heading(2, "b", "b"),
        Heading(1, "c", "c"),
        Picture("p", "", "", lambda: None),
    ]
    labels = number(blocks)
    assert labels == {
        "a": "Section 1",
        "t": "Table 1",
        "b": "Section 1.1",
        "c": "Section 2",
        "p": "Figure 1",
    }
    parts = list(spans(f"see {ref('p')}\x07.", labels))
    assert [(s.text, s.target) for s in parts] == [("see ", ""), ("Figure 1", "p"), ("\ufffd.", "")]
    assert Memo.__dataclass_params__.frozen


# --- bytes ----------------------------------------------------------------------------------------


@pytest.mark.slow
def test_written_again_the_bytes_are_the_same(memo_files):
    before = {p: p.read_bytes() for p in (memo_files.docx, memo_files.pdf, memo_files.html)}
    for path in write_memo(memo_files.folder, now=NOW):
        assert path.read_bytes() == before[path], path.name
    stamps = {i.date_time for i in zipfile.ZipFile(memo_files.docx).infolist()}
    assert stamps == {(1980, 1, 1, 0, 0, 0)}


def test_another_hour_changes_the_time_stamp_only(memo_files, tmp_path):
    twin = shutil.copytree(memo_files.folder, tmp_path / memo_files.folder.name)
    (later,) = write_memo(twin, formats=["html"], now=NOW + timedelta(hours=1))
    a, b = memo_files.html.read_text().splitlines(), later.read_text().splitlines()
    assert len(a) == len(b)
    differ = [(x, y) for x, y in zip(a, b, strict=True) if x != y]
    assert len(differ) == 2  # the page's head and the title block
    assert all(x.replace("12:30", "13:30") == y for x, y in differ)


# --- arithmetic -----------------------------------------------------------------------------------


def test_spans_are_joined():
    d = date(2025, 1, 1)

    def span(a, b):
        return (d + timedelta(a), d + timedelta(b))

    assert join_spans([span(5, 9), span(0, 2), span(3, 4), span(7, 8), span(20, 20)]) == (
        span(0, 9),
        span(20, 20),
    )
    assert join_spans([]) == ()


def test_need_is_the_fewest_strongest_panels(evidence):
    episode = next(e for e in evidence.year.episodes if e.contributors)
    for limit in (0.3, 0.6, 0.9):
        low = replace(episode, limit=limit * peak_of(episode).value)
        need = need_of(low)
        other = episode.check.total - episode.check.reflected
        assert need.allowed == pytest.approx(low.limit - other)
        loads = sorted((c.load for c in episode.contributors), reverse=True)
        if need.allowed > 0.0:
            assert need.keep == pytest.approx(min(1.0, need.allowed / episode.check.reflected))
            fewest = next(k for k in range(len(loads) + 1) if sum(loads[k:]) <= need.allowed + 1e-9)
            assert need.panels == fewest
            # turned by that much, light from that far off moves by the width of the spot
            moved = np.tan(2.0 * need.turn) * need.distance
            assert moved == pytest.approx(episode.check.width, rel=0.01)
    hopeless = need_of(replace(episode, limit=1.0))
    assert hopeless.allowed < 0.0
    assert hopeless.keep == 0.0


def test_each_place_and_harm_gets_a_close_look_first(evidence):
    base = evidence.year.seasons[0]

    def season(number, receiver, protects, peak, minutes):
        return replace(
            base,
            number=number,
            receiver=receiver,
            protects=protects,
            peak=peak,
            minutes_per_year=minutes,
        )

    skin, things = "people: skin", "things"
    seasons = [
        season(1, "a", skin, 2000.0, 900.0),
        season(2, "a", skin, 3000.0, 800.0),
        season(3, "b", skin, 1000.0, 700.0),
        season(4, "a", things, 9000.0, 90.0),
    ]
    chosen = [s.number for s in worth_a_close_look(seasons, 4)]
    assert chosen == [2, 3, 4, 1]
    assert [s.number for s in worth_a_close_look(seasons, 2)] == [2, 3]
    assert worth_a_close_look(seasons, 0) == []


# --- refusals and the command ---------------------------------------------------------------------


@pytest.mark.parametrize(
    "name", ["summary.json", "panels.npz", "model.glb", "chart.npz", "histories.npz"]
)
def test_partial_folders_are_refused(memo_files, tmp_path, name):
    twin = shutil.copytree(memo_files.folder, tmp_path / "copy")
    (twin / "memo.pdf").unlink()
    (twin / name).unlink()
    with pytest.raises(ResultError, match=re.escape(name)):
        write_memo(twin)
    assert not (twin / "memo.pdf").exists()


@pytest.mark.parametrize("name", ["panels.npz", "model.glb", "receivers.vtp"])
def test_broken_folders_are_refused(memo_files, tmp_path, name):
    twin = shutil.copytree(memo_files.folder, tmp_path / "copy")
    (twin / name).write_bytes(b"cut short")
    with pytest.raises(ResultError):
        write_memo(twin)


def test_formats_are_checked_before_anything_is_read(tmp_path, monkeypatch):
    with pytest.raises(InputError, match="'odt'"):
        write_memo(tmp_path, formats=["pdf", "odt"])
    with pytest.raises(InputError, match="none"):
        write_memo(tmp_path, formats=[])
    monkeypatch.setattr(memo_write, "find_spec", lambda name: None)
    with pytest.raises(InputError, match=r"memo extra.*reportlab.*pip install") as error:
        write_memo(tmp_path, formats=["pdf"])
    assert "causticload[memo]" in error.value.hint
    assert memo_write.available_formats() == ("html",)


def test_command_writes_what_is_asked(memo_files, tmp_path, capsys):
    twin = shutil.copytree(memo_files.folder, tmp_path / "copy")
    for path in twin.glob("memo.*"):
        path.unlink()
    assert main(["memo", str(twin), "--format", "html", "--json"]) == DONE
    assert json.loads(capsys.readouterr().out) == {"files": [str(twin / "memo.html")]}
    assert [p.name for p in twin.glob("memo.*")] == ["memo.html"]
    assert main(["memo", str(tmp_path / "none")]) == WRONG_INPUT
    captured = capsys.readouterr()
    assert "no such folder" in captured.err
    assert captured.err.count("\n") == 1
    assert main(["memo", str(twin), "--format", "rtf"]) == WRONG_INPUT


def test_a_host_gets_what_can_be_written(memo_files, tmp_path, monkeypatch):
    twin = shutil.copytree(memo_files.folder, tmp_path / "copy")
    monkeypatch.setattr(memo_write, "find_spec", lambda name: None)
    assert write_memo_for_host(twin, None) == [str(twin / "memo.html")]
    with pytest.raises(InputError, match="memo extra"):
        write_memo_for_host(twin, ["docx"])
