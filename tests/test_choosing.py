"""The command that chooses a thickness, from a panel file to its words."""

from pathlib import Path

import pytest

from kplate import cli
from kplate.choosing import choose_thickness

MESHES = Path(__file__).parents[1] / "meshes"


def panel(tmp_path, name, *changes):
    """A file like one of the gallery, with some of its text changed."""
    text = (MESHES / name).read_text("utf-8")
    for old, new in changes:
        assert old in text
        text = text.replace(old, new)
    path = tmp_path / name
    path.write_text(text, encoding="utf-8")
    return path


def test_size_says_what_to_take_and_why(tmp_path, capsys):
    """S1: 5 mm passes with a flag, 6 mm is the thinnest clean one."""
    path = panel(tmp_path, "pit-cover.toml", ('"10 mm"]', '"10 mm", "20 mm"]'))
    assert cli.main(["size", str(path)]) == 0
    lines = capsys.readouterr().out.splitlines()
    row = next(line for line in lines if line.startswith("5 mm   "))
    assert row.split("  ")[-1] == "passes, theory flagged"
    for words in ("peak deflection, wheel", "0.95", "1.05", "0.57", "1/120", "155.2 N"):
        assert f" {words} " in row
    at = lines.index("5 mm is the thinnest that passes.")
    assert lines[at + 1].startswith("FLAG: beyond small deflection, w/h 0.57 (0.5 is)")
    assert lines[at + 2] == "6 mm is the thinnest clean one: no flag."
    assert lines[at + 3] == "the verdict changes at h = 4.92 mm."
    assert lines[at + 4] == (
        "at 5 mm, wheel, peak deflection: -3.00 % for 1 % more h, -1.00 % for 1 % more "
        "E of steel S235, +1.00 % for 1 % more of load 1"
    )
    assert "strength 225.0 MPa at 20 mm (EN 10025-2)" in lines
    assert lines[-2].startswith("Not checked: welds")


def test_what_is_lost_of_a_thickness_is_counted(tmp_path):
    """5 mm less 0.5 mm is as 4.5 mm: 2.863 (5/4.5)^3 = 3.93 mm, no longer 3."""
    path = panel(
        tmp_path,
        "pit-cover.toml",
        ("stock =", 'under_tolerance = "0.3 mm"\ncorrosion = "0.2 mm"\nstock ='),
    )
    sized = choose_thickness(path)
    own = next(own for own in sized.sizing.sizes if own.nominal == 0.005)
    assert own.governs.value.value == pytest.approx(-2.863e-3 / 0.9**3, rel=1e-3)
    assert sized.sizing.thinnest.nominal == 0.006
    assert (
        "counted on: the thickness less 0.300 mm under tolerance and 0.200 mm "
        "corrosion; mass and self-weight of the whole."
    ) in sized.text


def test_a_stock_too_thin_fails(tmp_path, capsys):
    path = panel(
        tmp_path,
        "pit-cover.toml",
        ('["3 mm", "4 mm", "5 mm", "6 mm", "8 mm", "10 mm"]', '["3 mm"]'),
    )
    assert cli.main(["size", str(path)]) == 1
    out = capsys.readouterr().out
    assert (
        "no thickness of the stock passes; 3 mm: fails: peak deflection, peak von Mises"
    ) in out
    assert "the verdict changes at h = 4.92 mm." in out


def test_a_file_without_stock_or_limits_is_refused(tmp_path, capsys):
    stock = 'stock = ["3 mm", "4 mm", "5 mm", "6 mm", "8 mm", "10 mm"]'
    path = panel(tmp_path, "pit-cover.toml", (stock, ""))
    assert cli.main(["size", str(path)]) == 2
    assert capsys.readouterr().err == (
        f"kplate: {path}: [limits] stock is missing: there are no thicknesses to "
        'choose from; add stock = ["6 mm", "8 mm", "10 mm"].\n'
    )
    text = path.read_text("utf-8")
    path.write_text(text[: text.index("[limits]")] + f"[limits]\n{stock}\n", "utf-8")
    assert cli.main(["size", str(path)]) == 2
    assert "no limit is stated, so that every thickness would pass" in (
        capsys.readouterr().err
    )
    path.write_text(text + '\ncorrosion = "9 mm"\n' + stock, "utf-8")
    assert cli.main(["size", str(path)]) == 2
    assert "leave nothing of the stock thickness 3 mm" in capsys.readouterr().err
