"""What README says is what happens."""

import re
from pathlib import Path

import pytest

from kplate.check import check
from kplate.cli import main
from kplate.heading import version

ROOT = Path(__file__).parents[1]
README = (ROOT / "README.md").read_text("utf-8")


def block_after(marker):
    """Code block that follows a marker."""
    return README.split(marker, 1)[1].split("```")[1].split("\n", 1)[1]


def test_the_example_in_python_runs(tmp_path, monkeypatch, capsys):
    monkeypatch.chdir(tmp_path)
    code = block_after("## In Python")
    exec(compile(code, "README.md", "exec"), {})
    out = capsys.readouterr().out
    assert out.startswith("-0.9")
    assert (tmp_path / "cover.vtu").exists()


def test_the_panel_file_shown_is_read_and_passes(tmp_path):
    panel = tmp_path / "shown.toml"
    panel.write_text(block_after("## The panel file"), "utf-8")
    checked = check(panel)
    assert checked.status == 0


NUMBER = re.compile(r"[-+]?\d[\d.,e+-]*")


def test_the_output_shown_is_what_is_printed(tmp_path, capsys):
    """Numbers may move with the mesh by a few per cent; words and units may not.

    Which of the four corners is stressed most, on which face, how wide bands are and
    how many unknowns that takes is left to the mesh.
    """
    shown = block_after("<!-- pit-cover -->").splitlines()
    panel = ROOT / "meshes" / "pit-cover.toml"
    assert main(["check", str(panel), "--out", str(tmp_path)]) == 0
    printed = capsys.readouterr().out.splitlines()
    assert shown[0] == printed[0].replace(version(), "0.1.0")

    def parted(line):
        flat = re.sub(r"\([\d., ]+\) mm, (top|bottom)$", "", " ".join(line.split()))
        flat = re.sub(r"(< )?[\d.e-]+ %( [~?])?", "band", flat)
        if flat.startswith("tolerance") or " triangles: " in flat:
            return NUMBER.sub("#", flat), []
        numbers = [float(n.rstrip(".,-+e")) for n in NUMBER.findall(flat)]
        return NUMBER.sub("#", flat), numbers

    known = [parted(line) for line in printed[1:]]
    for line in shown[1:]:
        if "results/" not in line and "force and moments to" not in line:
            words, numbers = parted(line)
            near = pytest.approx(numbers, rel=0.05, abs=0.05)
            found = [other for text, other in known if text == words]
            assert any(other == near for other in found), line


def test_every_command_is_in_the_table():
    with pytest.raises(SystemExit):
        main(["--help"])
    for command in ("check", "compare", "new", "view"):
        assert f"`kplate {command} " in README


def test_the_top_level_is_as_agreed():
    allowed = {
        "README.md",
        "DEVELOPERS.md",
        "pyproject.toml",
        "kplate",
        "meshes",
        "tests",
        "benchmarks",
        "results",
        "build",
    }
    names = {p.name for p in ROOT.iterdir() if not p.name.startswith(".")}
    assert {n for n in names if not n.endswith(".egg-info")} <= allowed
