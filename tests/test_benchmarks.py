"""``python -m benchmarks``: what it prints, counts, refuses and measures."""

import html
import json
import re
import textwrap
from dataclasses import replace
from pathlib import Path

import numpy as np
import pytest

from benchmarks import (
    convergence,
    drawings,
    numbers,
    page,
    plots,
    records,
    report,
    timing,
)
from benchmarks.__main__ import main
from kplate.errors import InputError

# Deviations of numbers that have a band from their values, as shares: what is measured,
# doubled.
BANDED = 1.5e-4
# Numbers read from one mesh: corner forces, sides that are free or guided.
READ = 6e-4
PLATES = [
    "ssss_u_1",
    "cfsf_u_1",
    "cccc_p_1.2",
    "tri_eq_s_p",
    "rhomb_s_u_60",
    "corner4_p_1",
    "pure_twist",
    "cyl_cc",
    "sffs_u_1",
]


@pytest.mark.slow
@pytest.mark.parametrize("name", PLATES)
def test_numbers_with_bands_meet_their_values(name):
    measured = numbers.measure(records.record(name))
    assert not measured.failure
    assert len(measured.numbers) == len(records.record(name)["quantities"])
    for number in measured.numbers:
        banded = number.kind == "bound"
        assert abs(number.deviation) <= (BANDED if banded else READ), number
        if banded:
            assert number.half_band <= 1e-3
            assert number.lower - number.rounding <= number.value
            assert number.value <= number.upper + number.rounding


def test_signs_are_those_of_handbooks():
    measured = numbers.measure(records.record("ssss_u_1"), tolerance=0.05)
    assert all(number.computed > 0.0 for number in measured.numbers)
    assert all(number.value > 0.0 for number in measured.numbers)
    found = {number.quantity for number in measured.numbers}
    assert {"deflection", "corner force", "shear"} <= found


def test_dkt_and_one_mesh_have_no_bands():
    problem = records.record("cccc_u_1")
    for how in ({"element": "dkt"}, {"triangles": 200}):
        measured = numbers.measure(problem, **how)
        assert {number.kind for number in measured.numbers} == {"none"}
        assert {number.half_band for number in measured.numbers} == {None}


def test_a_figure_holds_what_rounds_to_it():
    item = {"quantity": "m_xx", "published": 0.0479, "publication": "a book"}
    (figure,) = records.figures(item)
    assert figure.half_unit == pytest.approx(0.5e-4)
    assert figure.holds(0.04794)
    assert not figure.holds(0.04784)
    assert figure.words == "a book"
    (figure,) = records.figures({**item, "published": "0.420", "from_memory": True})
    assert figure.half_unit == pytest.approx(0.5e-3)
    assert figure.words == "a book (from memory)"
    (figure,) = records.figures({**item, "rounding": 1e-3, "published": 2.0})
    assert figure.half_unit == 1e-3
    assert records.figures({"quantity": "m_xx", "published": None}) == []


def number(computed, value, published, **more):
    figures = records.figures(
        {"published": published, "publication": "a book", "from_memory": True}
    )
    given = {"lower": None, "upper": None, "kind": "none"} | more
    return numbers.Number(
        case="a case", family="a family", quantity="m_xx", place="centre",
        coefficient="M/(q*a^2)", value=value, digits=10, method="levy",
        figures=tuple(figures), computed=computed, scale=abs(published), **given,
    )  # fmt: skip


def test_numbers_are_sorted_by_how_near_they_come():
    inside = number(0.04788, 0.047886, 0.0479)
    near = number(0.04784, 0.047886, 0.0479)
    off = number(0.05, 0.047886, 0.0479)
    assert [n.print_class() for n in (inside, near, off)] == [
        "inside", "beyond", "beyond",
    ]  # fmt: skip
    assert number(0.99940, 1.0, 1.0).print_class() == "inside"  # 1 is printed to 0.5
    assert number(0.1001, 0.1, 0.10019).print_class() == "0.1 %"
    assert [n.value_class() for n in (inside, near, off)] == [
        "0.1 %",
        "0.1 %",
        "beyond",
    ]
    counts = report.tally("a family", [inside, near, off])
    assert (counts.figures, counts.inside, counts.printed_beyond) == (3, 1, 2)
    assert (counts.numbers, counts.near, counts.beyond) == (3, 2, 1)
    assert counts.largest == pytest.approx(0.05 / 0.047886 - 1.0)


def test_a_misprint_is_listed_with_its_evidence():
    bound = {"lower": 0.022904, "upper": 0.022906, "kind": "bound"}
    wrong = number(0.022905, 0.022905091, 0.0231, **bound)
    right = replace(wrong, figures=number(1.0, 1.0, 0.0229).figures)
    assert not right.misprints()
    problem = records.record("cccc_u_1")
    run = [numbers.Measured(problem=problem, numbers=(right, wrong))]
    (found,) = report.misprints(run)
    assert found.excluded
    assert found.units == pytest.approx(1.949, abs=1e-3)
    assert "printed 0.0231 in a book (from memory)" in found.words
    assert "kplate's bound 0.022904 to 0.022906 leaves it out" in found.words
    estimate = replace(wrong, kind="estimate")
    assert not estimate.excludes(wrong.figures[0])
    without = replace(wrong, value=None)
    assert not without.misprints()
    assert without.deviation == pytest.approx(0.022905 / 0.0231 - 1.0)


def test_the_command_prints_and_writes_every_number(tmp_path, capsys):
    target = tmp_path / "run.json"
    assert main(["cyl_ss", "sffs_u_1", "--tolerance", "1%", "--json", str(target)]) == 0
    out = capsys.readouterr().out
    assert "cyl_ss: Simply supported strip" in out
    assert "none known" in out
    assert "0 figures in print that the values do not round to" in out
    assert "thermal" not in out
    data = json.loads(target.read_text())
    assert [case["id"] for case in data["cases"]] == ["cyl_ss", "sffs_u_1"]
    found = data["cases"][0]["numbers"][0]
    assert found["value"] == pytest.approx(5 / 384)
    assert found["kind"] == "bound"
    assert abs(found["deviation"]) < 1e-6
    assert data["tallies"][-1]["family"] == "all"


def test_mistakes_are_named(capsys):
    assert main(["ssss_u_11"]) == 2
    assert "there is no case 'ssss_u_11'; did you mean" in capsys.readouterr().err
    assert main(["--family", "cubes"]) == 2
    assert "the families are rectangles, hydrostatic" in capsys.readouterr().err
    with pytest.raises(SystemExit):
        main(["--tolerance", "2"])
    assert "'2' is no tolerance" in capsys.readouterr().err
    assert main(["--family", "ellipse", "--list"]) == 0
    assert "ellipse_C_2.0" in capsys.readouterr().out


CASE = """
title = "Square"
family = "rectangles"
nu = 0.3
supports = { south = "clamped" }
load = { kind = "uniform", pressure = -1.0 }
outline = { polygon = [[0, 0], [1, 0], [1, 1]], sides = ["south", "east", "north"] }

[[quantities]]
quantity = "m_yy"
at = [0.5, 0.0]
place = "middle of the clamped side"
coefficient = "M/(q*a^2)"
"""


@pytest.mark.parametrize(
    ("text", "words"),
    [
        (CASE, "number 1 has neither a value nor a published figure"),
        (CASE + "value = -0.2", "give its 'digits' and 'method'"),
        (CASE + "published = -0.2", "say in which 'publication'"),
        (CASE + "normal = [0, 1]", "a moment and a shear have a 'normal'"),
        (CASE + "valeu = 3", "'valeu', which is not read; it may hold also, at"),
        (CASE.replace("m_yy", "m_zz"), "there is no quantity 'm_zz'"),
        (CASE.replace("title", "titel"), "has no 'title'"),
        (CASE.replace("place", "plaice"), "'plaice', which is not read"),
        ("title = ", "is no TOML"),
    ],
)
def test_a_file_with_a_mistake_is_refused(tmp_path, text, words):
    path = tmp_path / "mine.toml"
    path.write_text(text)
    with pytest.raises(InputError, match=r"mine\.toml") as error:
        records.read(path)
    assert words in str(error.value)


def test_a_case_of_one_s_own_is_read_and_solved(tmp_path):
    path = tmp_path / "mine.toml"
    path.write_text(
        CASE + 'published = "-0.2050"\npublication = "my own table"\nfrom_memory = true'
    )
    measured = numbers.measure(records.read(path), tolerance=0.01)
    (found,) = measured.numbers
    assert (found.case, found.value, found.kind) == ("mine", None, "bound")
    assert found.figures[0].half_unit == pytest.approx(0.5e-4)
    assert np.isfinite(found.computed)


def test_the_case_that_developers_are_shown_is_solved(tmp_path):
    text = (Path(__file__).parents[1] / "DEVELOPERS.md").read_text("utf-8")
    (shown,) = re.findall(r"^  ```toml\n(.*?)^  ```$", text, re.DOTALL | re.MULTILINE)
    path = tmp_path / "shown.toml"
    path.write_text(textwrap.dedent(shown))
    (found,) = numbers.measure(records.read(path)).numbers
    assert (found.print_class(), found.kind) == ("inside", "bound")
    assert abs(found.deviation) < 1e-6


def test_every_file_in_own_is_read_and_every_record_becomes_a_plate():
    from benchmarks import cases
    from benchmarks.asking import ask

    assert {"sffs_u_1", "scfs_u_1"} <= {own["id"] for own in records.records()}
    names = [own["id"] for own in records.records()]
    assert len(set(names)) == len(names)
    for own in records.records():
        plate = cases.plate(own)
        assert cases.loads(own)
        for item in own["quantities"]:
            asked = ask(plate, own, item)
            assert bool(asked.goals) != bool(asked.reason)


def test_there_are_enough_numbers_with_sources():
    items = [item for own in records.records() for item in own["quantities"]]
    figures = [figure for item in items for figure in records.figures(item)]
    assert len(items) > 1000
    assert len(figures) > 200
    assert all(figure.publication for figure in figures)
    assert all(records.method(item) != "none known" for item in items)
    assert sum(not figure.from_memory for figure in figures) > 20


@pytest.mark.slow
def test_a_study_shows_orders_and_what_adapting_saves(tmp_path, capsys):
    """The clamped edge moment: order 4 of the quintic, 2 of HCT; bands hold."""
    own = convergence.study(records.record("cccc_u_1"), 4, most=8_000)
    series = {(one.element, one.meshes): one for one in own.series}
    least = 10.0 * own.resolution
    assert series["quintic", "even"].order(least) == pytest.approx(4.2, abs=0.8)
    assert series["hct", "even"].order(least) == pytest.approx(2.3, abs=0.8)
    assert series["dkt", "even"].order(least) == pytest.approx(1.3, abs=0.6)
    adapted = series["quintic", "adaptive"].runs
    assert all(run.error <= run.half_band for run in adapted)
    even = [run for run in series["quintic", "even"].runs if run.error > 1e-5]
    assert adapted[-1].unknowns < even[-1].unknowns
    assert adapted[-1].error < 0.1 * even[-1].error
    text = plots.convergence_plot(own)
    assert text.startswith("<svg")
    assert "quintic, half band" in text
    assert 'xlink:href="http' not in text


def test_the_numbers_of_a_case_are_listed(capsys):
    assert main(["convergence", "cccc_u_1"]) == 0
    assert "  4  M/(q*a^2) at mid edge x=0" in capsys.readouterr().out
    assert main(["convergence", "cccc_u_1", "--number", "99"]) == 2
    assert "has numbers 1 to 9, not 99" in capsys.readouterr().err


def test_an_order_is_the_slope_through_finer_runs():
    runs = [
        convergence.Run(unknowns=n, error=n**-1.5, half_band=None, seconds=0.0)
        for n in (1, 2, 100, 200, 400, 800)
    ]
    own = convergence.Series(element="hct", meshes="even", runs=tuple(runs))
    assert own.order(0.0) == pytest.approx(3.0)
    assert own.order(3e-4) is None  # two runs of the finer ones are above


def test_a_timing_adds_up(capsys):
    """No time is judged: they belong to the machine."""
    first, second = timing.measure(2_000), timing.measure(6_000)
    for own in (first, second):
        assert own.unknowns == pytest.approx(2_000 if own is first else 6_000, rel=0.3)
        assert own.ratio > 1.0
        assert own.bare == own.stages["ordering"] + own.stages["factor"]
        assert 0.0 < own.memory <= own.memory_all
    text = "\n".join(
        [*map(timing.lines_of, (first, second)), *timing.summary((first, second))]
    )
    assert "growth exponent of solve" in text
    assert "aim 1.7" in text
    assert plots.timing_plot((first, second)).startswith("<svg")
    slow = replace(second, unknowns=4 * first.unknowns, solve=8.0 * first.solve)
    assert timing.exponent((first, slow)) == pytest.approx(1.5)


def test_the_page_stands_alone_and_holds_every_number():
    names = ("sffs_u_1", "cccc_u_1", "cyl_ss")
    run = [numbers.measure(records.record(n), tolerance=0.05) for n in names]
    times = [timing.measure(n) for n in (1_000, 2_000)]
    text = page.page(run, timings=times, version="1.2.3", words="on & off")
    assert text.startswith("<!doctype html>")
    assert "kplate 1.2.3 beside handbooks" in text
    assert "on &amp; off" in text
    assert page.sentence(run) in text
    for mark in ("<script", "<img", "<link", "@import", "url(h", 'href="http', "src="):
        assert mark not in text
    for one in run:
        assert f"<b>{one.problem['id']}</b>" in text
        for own in one.numbers:
            assert f"<td>{own.computed:.7g}" in text
    assert "printed 0.0231 in TW, Table 35 (from memory), value 0.022905091" in text
    assert "in exact" not in text
    assert text.count("<svg") >= 2 + len(run)


def test_a_cut_figure_is_told_from_a_wrong_one():
    problem = records.record("cccc_u_1")
    cut, wrong = number(0.0012653, 0.0012653, 0.00126), number(1.0, 0.0229, 0.0231)
    found = report.misprints([numbers.Measured(problem=problem, numbers=(cut, wrong))])
    assert [one.cut for one in found] == [False, True]
    assert "cut off, not rounded" in found[1].words


@pytest.mark.slow
def test_an_ellipse_is_drawn_by_arcs_and_its_bands_are_estimates():
    """They are bounds for the arcs, which are 4e-6 off in the deflection."""
    found = numbers.measure(records.record("ellipse_C_2.0"), tolerance=0.01).numbers
    assert found[0].deviation == pytest.approx(4.2e-6, rel=0.3)
    assert {number.kind for number in found} == {"estimate", "none"}


def test_a_small_drawing_shows_each_support_once():
    from benchmarks import cases

    text = drawings.thumbnail(cases.plate(records.record("ann_0.5_iG_oS_u")))
    assert text.count("class=ks") == 2  # two half circles
    assert text.count("class=kg") == 2
    assert " 0 0 0 " in text  # arcs of a circle run to the left
    text = drawings.thumbnail(cases.plate(records.record("corner4_p_1")))
    assert text.count("class=kf") == 4
    assert text.count("<circle") == 4


def test_readme_quotes_the_page():
    root = Path(__file__).parents[1]
    kept = (root / "benchmarks" / "page.html").read_text("utf-8")
    (shown,) = re.findall(r"<p id=sentence>(.*)</p>", kept)
    readme = " ".join((root / "README.md").read_text("utf-8").split())
    assert html.unescape(shown) in readme
    assert "benchmarks/page.html" in readme
    assert len(kept) < 500_000
