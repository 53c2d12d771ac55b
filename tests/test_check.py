"""From a panel file to a judged answer, and the command line around it."""

import csv
import itertools
import json
import os
import subprocess
import sys
from pathlib import Path

import numpy as np
import oracles
import pytest

from kplate import cli
from kplate.check import check, new_panel
from kplate.heading import version
from kplate.limits import Outcome
from kplate.panel import read_panel

MESHES = Path(__file__).parents[1] / "meshes"


@pytest.fixture(scope="module")
def pit(tmp_path_factory):
    return check(MESHES / "pit-cover.toml", out=tmp_path_factory.mktemp("pit"))


def found(checked, case, quantity):
    return next(
        line for line in checked.lines if (line.case, line.quantity) == (case, quantity)
    )


def test_pit_cover_meets_its_series_and_passes(pit):
    """Navier series; SCENARIOS of the project: 800 x 600 x 6 mm, S235."""
    expected = {
        ("uniform", "peak deflection"): 1.034e-3,
        ("wheel", "peak deflection"): 1.657e-3,
        ("wheel", "peak von Mises"): 43e6,
        ("uniform", "corner hold-down"): 146.1,
        ("wheel", "corner hold-down"): 155.2,
        ("wheel", "total reaction"): 1500.0,
        ("uniform", "total reaction"): 2400.0,
    }
    for (case, quantity), value in expected.items():
        line = found(pit, case, quantity)
        assert abs(line.value.value) == pytest.approx(value, rel=0.01), quantity
    assert pit.verdict.outcome is Outcome.PASSES
    assert pit.verdict.words == "passes"
    assert pit.status == 0
    assert pit.validity.holds
    wheel = found(pit, "wheel", "peak deflection")
    assert wheel.judgement.used == pytest.approx(1.657 / 3.0, rel=0.01)
    assert wheel.value.place == pytest.approx((0.4, 0.3), abs=2e-3)


def test_bands_are_inside_the_tolerance_and_hold_the_series(pit):
    """Navier's series at the centre; the deflection there is a bound."""
    loads = {
        "uniform": oracles.LinearPressure(at_origin=-5e3),
        "wheel": oracles.PatchForce(centre=(0.4, 0.3), size=(0.2, 0.2), force=-1.5e3),
    }
    D = pit.panel.plate.material.bending_stiffness(0.006)
    for case, load in loads.items():
        series = -oracles.navier([(0.4, 0.3)], (0.8, 0.6), load).w[0] / D
        there = found(pit, case, "deflection there").value
        assert there.kind == "bound"
        assert there.upper - there.lower < 2e-4 * abs(there.value)
        assert -there.value == pytest.approx(series, rel=1e-4)
        for quantity in ("peak deflection", "peak von Mises"):
            value = found(pit, case, quantity).value
            assert value.kind == "estimate"
            assert value.upper - value.lower < 2.0 * 0.01 * abs(value.value)
        assert found(pit, case, "total reaction").value.kind == "bound"
        assert found(pit, case, "corner hold-down").value.kind == "indicator"
    assert pit.solution.reached


def test_under_an_even_load_the_corners_are_stressed_most(pit):
    """Twist: at 5 mm 30.4 against 27.5 MPa at the centre; stress goes with 1/h^2."""
    value = pit.solution.peak("von Mises", case="uniform")
    assert value.value == pytest.approx(30.4e6 * (5 / 6) ** 2, rel=0.01)
    x, y = value.place
    assert min(x, 0.8 - x) + min(y, 0.6 - y) == pytest.approx(0.0, abs=1e-9)


def test_tank_wall_meets_its_series_and_passes():
    """Ritz values: foot edge 309.6 N (51.6 MPa), w 1.3832 mm 420 mm above the foot."""
    checked = check(MESHES / "tank-wall.toml")
    (case,) = checked.solution.cases
    peak = checked.solution.peak("deflection")
    assert abs(peak.value) == pytest.approx(1.3832e-3, rel=0.01)
    assert peak.place == pytest.approx((0.6, 0.42), abs=5e-3)
    centre = checked.solution.deflection([(0.6, 0.45)])[0]
    assert abs(centre) == pytest.approx(1.3716e-3, rel=0.01)
    foot, top, side = (0.6, 0.0), (0.6, 0.9), (0.0, 0.45)
    moments = np.abs(checked.solution.moments([foot, top, side]))
    assert moments[0, 1] == pytest.approx(309.6, rel=0.01)
    assert moments[1, 1] == pytest.approx(191.7, rel=0.01)
    assert moments[2, 0] == pytest.approx(202.1, rel=0.01)
    total = checked.solution.reactions().total
    assert abs(total.force) == pytest.approx(4767.7, rel=1e-3)
    about_top = abs(total.moment_x - 0.9 * total.force)
    assert about_top == pytest.approx(2860.6, rel=1e-3)
    line = found(checked, case, "peak largest principal")
    assert line.value.value == pytest.approx(51.6e6, rel=0.01)
    assert checked.verdict.outcome is Outcome.PASSES


def test_pane_meets_its_series_and_passes_with_a_flag():
    """Navier series, 6 mm: w 5.81 mm, 13.20 MPa, corner pull 94.4 N."""
    checked = check(MESHES / "pane.toml")
    case = checked.solution.cases[0]
    assert abs(found(checked, case, "peak deflection").value.value) == pytest.approx(
        5.81e-3, rel=0.01
    )
    stress = found(checked, case, "peak largest principal")
    assert stress.value.value == pytest.approx(13.20e6, rel=0.01)
    assert found(checked, case, "corner hold-down").value.value == pytest.approx(
        94.4, rel=0.01
    )
    assert checked.status == 0
    assert not checked.validity.small
    assert "linear theory is conservative for the deflection" in checked.text


def test_the_irregular_cover_is_judged_with_its_corner_left_out():
    checked = check(MESHES / "landing-cover.toml")
    supports = {s.name for s in checked.panel.plate.supports.values()}
    sides = checked.panel.plate.outline.side_names
    assert supports | {checked.panel.plate.support(s).name for s in sides} == {
        "clamped",
        "simply supported",
        "free",
    }
    assert len(checked.solution.excluded) == 1
    assert checked.verdict.words.endswith("1 place to judge")
    assert "left out of peaks and line reactions:" in checked.text
    # The shaft is a true arc, so that the area under the load is exact.
    for case in checked.solution.cases:
        assert found(checked, case, "total reaction").value.kind == "bound"
    for case in checked.solution.cases:
        assert checked.solution.reactions(case=case).imbalance < 1e-11


def test_the_text_echoes_panel_supports_and_balance(pit):
    text = pit.text.splitlines()
    digest = pit.panel.digest
    assert text[0].endswith(f"input {digest}, kplate {version()}")
    assert text[1] == (
        "your panel is 800 x 600 mm, 0 holes, area 0.48 m2, mass 22.61 kg"
    )
    assert text[2] == (
        "simply supported (w = 0, rotation free, uplift held): south, east, north, west"
    )
    assert any(line.startswith("tolerance 1 %: reached, ") for line in text)
    assert any(
        line.startswith("balance of wheel: loads -1500 N, supports +1500 N")
        for line in text
    )
    assert "passes.   thin: h/L 1/100." in pit.text
    assert max(len(line) for line in text) <= 160
    assert text[-2].startswith("Not checked: welds, bolts, the frame, fatigue")
    assert "local codes and licensed practice decide." in text[-1]


def test_results_are_written_and_agree(pit):
    names = sorted(path.name for path in pit.files)
    assert names == [
        "pit-cover-reactions.csv",
        "pit-cover.json",
        "pit-cover.png",
        "pit-cover.vtu",
    ]
    folder = pit.files[0].parent
    assert sorted(p.name for p in folder.iterdir()) == names
    record = json.loads((folder / "pit-cover.json").read_text("utf-8"))
    assert record["verdict"]["words"] == pit.verdict.words
    assert record["panel"]["input"] == pit.panel.digest
    with (folder / "pit-cover-reactions.csv").open(newline="") as file:
        assert len(list(csv.reader(file))) > 100


def test_a_panel_that_fails_says_so_and_exits_with_1(tmp_path, capsys):
    text = (MESHES / "pit-cover.toml").read_text("utf-8")
    thin = tmp_path / "thin.toml"
    thin.write_text(text.replace('thickness = "6 mm"', 'thickness = "3 mm"'), "utf-8")
    status = cli.main(["check", str(thin), "--out", str(tmp_path / "out")])
    out = capsys.readouterr().out
    assert status == 1
    assert "fails: peak deflection, peak von Mises." in out


def test_a_mistake_is_one_line_on_stderr_and_exit_2(tmp_path, capsys):
    bad = tmp_path / "bad.toml"
    text = (MESHES / "pit-cover.toml").read_text("utf-8")
    bad.write_text(text.replace('"1.5 kN down"', '"1.5 kN"'), "utf-8")
    assert cli.main(["check", str(bad), "--out", str(tmp_path / "out")]) == 2
    captured = capsys.readouterr()
    assert captured.out == ""
    assert captured.err.startswith(f"kplate: {bad}: [[case]] ")
    assert captured.err.count("\n") == 1
    assert not (tmp_path / "out").exists()


@pytest.mark.parametrize("command", ["check", "view"])
def test_a_missing_file_is_named(tmp_path, capsys, command):
    path = tmp_path / "nowhere.toml"
    assert cli.main([command, str(path)]) == 2
    err = capsys.readouterr().err
    assert str(path) in err
    assert err.count("\n") == 1


def test_a_loose_plate_is_refused_by_its_motion(tmp_path, capsys):
    text = (MESHES / "pit-cover.toml").read_text("utf-8")
    for side in ("south", "east", "north"):
        text = text.replace(f'{side} = "simply supported"\n', "")
    loose = tmp_path / "loose.toml"
    loose.write_text(text, "utf-8")
    assert cli.main(["check", str(loose), "--out", str(tmp_path / "out")]) == 2
    assert "tilt about x = 0 m" in capsys.readouterr().err


def test_an_output_directory_that_is_a_file_is_refused(tmp_path, capsys):
    blocked = tmp_path / "taken"
    blocked.write_text("mine", "utf-8")
    panel = MESHES / "tank-wall.toml"
    assert cli.main(["check", str(panel), "--out", str(blocked)]) == 2
    assert "choose another with --out" in capsys.readouterr().err
    assert blocked.read_text("utf-8") == "mine"


def test_new_writes_a_panel_that_checks_and_keeps_what_is_there(tmp_path, capsys):
    path = tmp_path / "mine.toml"
    assert cli.main(["new", str(path)]) == 0
    assert "kplate check" in capsys.readouterr().out
    panel = read_panel(path)
    assert panel.cases
    path.write_text("precious", "utf-8")
    assert cli.main(["new", str(path)]) == 2
    assert "exists already" in capsys.readouterr().err
    assert path.read_text("utf-8") == "precious"
    starter = new_panel(tmp_path / "starter.toml")
    lines = [s.strip() for s in starter.read_text("utf-8").splitlines()]
    for before, line in itertools.pairwise(lines):
        if "=" in line and not line.startswith("#"):
            assert "#" in line or before.startswith("#"), line


def test_results_land_below_the_current_directory(tmp_path):
    """As a user runs it: a process, from any directory."""
    run = subprocess.run(
        [sys.executable, "-m", "kplate", "check", str(MESHES / "pit-cover.toml")],
        cwd=tmp_path,
        env={k: v for k, v in os.environ.items() if k != "DISPLAY"},
        capture_output=True,
        text=True,
        check=False,
    )
    assert run.returncode == 0, run.stderr
    assert run.stderr == ""
    assert (tmp_path / "results" / "pit-cover" / "pit-cover.vtu").exists()


def test_usage_and_version(capsys):
    with pytest.raises(SystemExit) as caught:
        cli.main(["--version"])
    assert caught.value.code == 0
    assert capsys.readouterr().out == f"kplate {version()}\n"
    with pytest.raises(SystemExit) as caught:
        cli.main(["solve-it"])
    assert caught.value.code == 2


def octagon(tmp_path, **limits):
    """A simply supported octagon: no corner has a finite force."""
    angle = np.pi / 4 * (np.arange(8) + 0.5)
    points = np.round(300 * np.column_stack([np.cos(angle), np.sin(angle)]), 6)
    stated = "\n".join(f'"{key}" = {value}' for key, value in limits.items())
    sides = "\n".join(f'"side-{k + 1}" = "simply supported"' for k in range(8))
    path = tmp_path / "octagon.toml"
    path.write_text(
        f"""
[panel]
name = "hatch"
thickness = "6 mm"
material = "steel S235"
[outline]
unit = "mm"
points = {points.tolist()}
[supports]
{sides}
[[case]]
name = "snow"
loads = [{{ pressure = "2 kPa down" }}]
[limits]
{stated}
""",
        "utf-8",
    )
    return path


def test_a_corner_without_a_finite_force_is_never_a_pass(tmp_path):
    path = octagon(tmp_path, hold_down='"100 N"')
    checked = check(path)
    line = found(checked, "snow", "corner hold-down")
    assert np.isnan(line.value.value)
    assert checked.verdict.words == (
        "not proven: corner hold-down not known at 8 corners"
    )
    assert checked.status == 1
    assert "not known at 8 corners" in checked.text


def test_uplift_of_a_side_is_listed(tmp_path):
    """Pushed up, the whole panel hangs on its sides."""
    text = (MESHES / "pit-cover.toml").read_text("utf-8")
    up = tmp_path / "up.toml"
    up.write_text(text.replace("kPa down", "kPa up"), "utf-8")
    line = found(check(up), "uniform", "side hold-down")
    # Levy series for sides 4 to 3: .473 p times the short side, on the long side.
    assert line.value.value == pytest.approx(0.4727 * 5e3 * 0.6, rel=0.03)
    assert "side hold-down" not in check(MESHES / "pit-cover.toml").text


def test_blunt_corners_flag_the_verdict(tmp_path):
    path = octagon(tmp_path, deflection='{ at_most = "5 mm" }')
    assert check(path).verdict.words == "passes, bands not estimated"
    text = path.read_text("utf-8")
    gable = "[[-300, -200], [300, -200], [300, 200], [0, 250], [-300, 200]]"
    start = text.index("points = ") + 9
    supports = "\n".join(f'"side-{k}" = "simply supported"' for k in range(1, 6))
    blunt = tmp_path / "gable.toml"
    cases = text.index("[[case]]")
    blunt.write_text(
        f"{text[:start]}{gable}\n[supports]\n{supports}\n{text[cases:]}", "utf-8"
    )
    checked = check(blunt)
    assert checked.verdict.words == "passes, bands not estimated, theory flagged"
    assert "1 simply supported corner of more than 155 degrees" in checked.text


def test_a_result_never_replaces_the_panel_file(tmp_path, capsys):
    panel = tmp_path / "cover.json"
    panel.write_bytes((MESHES / "pit-cover.toml").read_bytes())
    before = panel.read_bytes()
    assert cli.main(["check", str(panel), "--out", str(tmp_path)]) == 2
    assert "would replace the panel file itself" in capsys.readouterr().err
    assert panel.read_bytes() == before


def test_names_with_dots_keep_their_results_apart(tmp_path):
    for name in ("cover.v1.toml", "cover.v2.toml"):
        panel = tmp_path / name
        panel.write_bytes((MESHES / "tank-wall.toml").read_bytes())
        check(panel, out=tmp_path / "out")
    names = {p.name for p in (tmp_path / "out").iterdir()}
    assert {"cover.v1.vtu", "cover.v2.vtu", "cover.v1.json", "cover.v2.json"} <= names


def test_a_terminal_that_holds_no_accents_still_gets_the_table(tmp_path):
    text = (MESHES / "pit-cover.toml").read_text("utf-8")
    panel = tmp_path / "umlaut.toml"
    panel.write_text(text.replace("pump-pit cover", "Schächte №7"), "utf-8")
    run = subprocess.run(
        [sys.executable, "-m", "kplate", "check", str(panel)],
        cwd=tmp_path,
        env={**os.environ, "PYTHONIOENCODING": "ascii"},
        capture_output=True,
        check=False,
    )
    assert run.returncode == 0, run.stderr
    assert b"Sch?chte ?7" in run.stdout


def test_a_full_disk_behind_stdout_is_one_line(tmp_path):
    with Path("/dev/full").open("w") as full:
        run = subprocess.run(
            [sys.executable, "-m", "kplate", "new", str(tmp_path / "a.toml")],
            stdout=full,
            stderr=subprocess.PIPE,
            text=True,
            check=False,
        )
    assert run.returncode == 2
    assert "the results cannot be printed" in run.stderr
    assert run.stderr.count("\n") == 1


def test_a_bolt_that_is_pulled_is_held_against_the_limit(tmp_path):
    text = (MESHES / "pit-cover.toml").read_text("utf-8")
    text = text.replace("kPa down", "kPa up")
    bolt = '[[mark]]\nname = "bolt"\nat = [400, 300]\n\n[supports]\n'
    text = text.replace("[supports]\n", bolt + 'bolt = "simply supported"\n')
    text = text.replace("[limits]", '[limits]\nhold_down = "100 N"')
    panel = tmp_path / "bolted.toml"
    panel.write_text(text, "utf-8")
    checked = check(panel)
    line = found(checked, "uniform", "bolt hold-down")
    assert line.value.value > 100.0
    assert line.judgement.outcome is Outcome.FAILS
    assert checked.status == 1
