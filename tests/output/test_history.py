"""The way to a tolerance: kept, drawn and recorded."""

import json

import pytest
from matplotlib.figure import Figure
from plates import rectangle

from kplate.adapt import solve
from kplate.errors import InputError
from kplate.loads import Pressure
from kplate.output import history
from kplate.output.history import write_history
from kplate.output.record import solution_record
from kplate.supports import CLAMPED


@pytest.fixture(scope="module")
def solution():
    return solve(rectangle(CLAMPED), [Pressure(-1.0)], tolerance=0.001)


@pytest.mark.parametrize("ending", [".png", ".svg", ".pdf"])
def test_the_picture_is_written(solution, tmp_path, ending):
    path = write_history(solution, tmp_path / f"bands{ending}")
    assert path.stat().st_size > 1000
    assert list(tmp_path.iterdir()) == [path]


def test_it_has_a_line_a_goal_and_the_tolerance(solution, tmp_path, monkeypatch):
    drawn = []
    keep = Figure.savefig
    monkeypatch.setattr(
        Figure,
        "savefig",
        lambda self, *a, **k: (drawn.append(self), keep(self, *a, **k)),
    )
    write_history(solution, tmp_path / "bands.png")
    (axes,) = drawn[0].axes
    labels = [line.get_label() for line in axes.lines]
    assert labels[-1] == "tolerance"
    assert "peak deflection" in labels
    assert "peak von Mises" in labels
    for line in axes.lines[:-1]:
        widths = [100.0 * step.bands[line.get_label()] for step in solution.history]
        assert list(line.get_ydata()) == widths
        assert list(line.get_xdata()) == [step.unknowns for step in solution.history]
    assert axes.lines[-1].get_ydata()[0] == pytest.approx(0.1)


def test_the_record_holds_the_steps(solution):
    record = json.loads(json.dumps(solution_record(solution, "0")))
    assert record["tolerance"] == 0.001
    assert len(record["history"]) == len(solution.history)
    assert record["history"][-1]["reached"] is True
    assert record["history"][-1]["bands"] == solution.history[-1].bands
    assert "seconds" not in record["history"][-1]


def test_what_cannot_be_drawn_is_refused(solution, tmp_path):
    with pytest.raises(InputError, match=r"must end in \.png, \.svg or \.pdf"):
        write_history(solution, tmp_path / "bands.gif")
    single = solve(rectangle(CLAMPED), [Pressure(-1.0)], triangles=200)
    with pytest.raises(InputError, match="solved on a single mesh"):
        write_history(single, tmp_path / "bands.png")
    assert history.LEAST > 0.0
