"""Influence surfaces are drawn with the result, its unit and its place."""

import numpy as np
import pytest
from plates import grid, rectangle, solved

from kplate.errors import InputError
from kplate.goals import (
    ClampingMoment,
    Deflection,
    LineReaction,
    MeanDeflection,
    Moment,
    Resultant,
    Shear,
    Slope,
)
from kplate.influence import influence
from kplate.loads import Case, Pressure
from kplate.output.surface import influence_figure, write_influence
from kplate.solution import Solution
from kplate.solve.static import solve_static
from kplate.supports import CLAMPED, SIMPLY_SUPPORTED
from kplate.units import DisplayUnits

PLATE = rectangle({"west": CLAMPED, "east": SIMPLY_SUPPORTED}, a=1.2)
CASES = [Case(name="load", loads=[Pressure(1.0)])]
QUINTIC = Solution(state=solve_static(PLATE, grid(5, a=1.2), CASES, element="quintic"))
AT = (0.55, 0.45)


@pytest.mark.parametrize(
    ("goal", "title", "label"),
    [
        (Deflection(at=AT), "deflection at (550, 450) mm", "deflection [mm]"),
        (MeanDeflection(), "mean deflection of the plate", "mean deflection [mm]"),
        (Slope(at=AT, direction=(1.0, 0.0)), "slope at (550, 450) mm", "slope [rad]"),
        (Moment(at=AT, component="m_xx"), "m_xx at (550, 450) mm", "m_xx [N]"),
        (Shear(at=AT, direction=(1.0, 0.0)), "transverse shear at", "shear [N/mm]"),
        (ClampingMoment(at=(0.0, 0.5)), "m_nn at (0, 500) mm", "m_nn [N]"),
        (LineReaction(at=(1.2, 0.5)), "line reaction at", "line reaction [N/mm]"),
        (Resultant(of="east"), "force of east", "force [N]"),
    ],
)
def test_a_picture_names_its_result_unit_and_force(goal, title, label, tmp_path):
    surface = influence(QUINTIC, goal)
    drawn = influence_figure(surface, DisplayUnits())
    axes, bar = drawn.axes
    assert f"Influence surface: {title}" in axes.get_title(loc="left")
    assert label in bar.get_ylabel()
    blank = [own for own in axes.patches if own.get_facecolor() == (1.0, 1.0, 1.0, 1.0)]
    assert len(blank) == isinstance(goal, LineReaction)
    assert "1 kN down" in bar.get_ylabel()
    path = write_influence(surface, tmp_path / "surface.png")
    assert path.stat().st_size > 10_000


def test_colours_are_the_result_of_a_kilonewton_down():
    goal = Deflection(at=AT)
    drawn = influence_figure(influence(QUINTIC, goal), DisplayUnits())
    ticks = drawn.axes[1].get_yticks()
    w = -1e6 * influence(QUINTIC, goal).at(np.array([AT]))[0]  # mm by 1 kN down
    assert ticks.min() <= w <= ticks.max()
    assert ticks.min() > 2.0 * w


def test_dkt_deflections_are_drawn_too(tmp_path):
    surface = influence(solved(PLATE, grid(6, a=1.2), Pressure(1.0)), Deflection(at=AT))
    assert write_influence(surface, tmp_path / "w.svg").exists()


def test_another_ending_is_refused(tmp_path):
    surface = influence(QUINTIC, Deflection(at=AT))
    with pytest.raises(InputError, match=r"must end in \.png, \.svg or \.pdf"):
        write_influence(surface, tmp_path / "w.bmp")
