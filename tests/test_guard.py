"""Gmsh never keeps the caller waiting for ever."""

import time

import numpy as np
import pytest

from kplate.arrays import read_only_floats
from kplate.errors import InputError, MeshError
from kplate.guard import mesh_guarded, read_step_guarded
from kplate.meshing import mesh_outline
from kplate.outline import Outline
from kplate.shapes import Circle


def past_the_checks(points):
    """An outline whose points were changed after it was checked."""
    outline = Outline.polygon([(0, 0), (1, 0), (1, 1), (0, 1)])
    object.__setattr__(outline.rim, "points", read_only_floats(points))
    for name in ("region", "turns", "straight", "box"):
        outline.rim.__dict__.pop(name, None)
    return outline


@pytest.mark.slow
def test_a_self_crossing_outline_is_stopped():
    """Gmsh hangs on it: the second process is killed and the reason given."""
    crossing = past_the_checks([(0, 0), (1, 1), (1, 0), (-0.5, 1.2)])
    start = time.monotonic()
    with pytest.raises(MeshError):
        mesh_guarded(crossing, size=0.1, seconds=8.0)
    assert time.monotonic() - start < 30.0


def test_the_time_limit_is_said():
    outline = Outline.polygon([(0, 0), (1, 0), (1, 1), (0, 1)])
    with pytest.raises(MeshError) as caught:
        mesh_guarded(outline, size=0.05, seconds=0.01)
    assert str(caught.value) == (
        "Gmsh did not come back within 0.01 s, meshing at size 0.05 m; draw what "
        "nearly touches apart, or ask for fewer triangles."
    )


def test_the_mesh_is_the_same_as_without_a_guard():
    hole = Circle(centre=(0.4, 0.5), radius=0.2, name="hole")
    outline = (
        Outline.polygon([(0, 0), (1, 0), (1, 1), (0, 1)])
        .cut(hole)
        .seam([(0.7, 0.0), (0.7, 1.0)], name="rib")
        .mark((0.85, 0.5), name="post")
    )
    guarded = mesh_guarded(outline, size=0.1, fine=[((0.0, 0.0), 0.02)])
    plain = mesh_outline(outline, size=0.1, fine=[((0.0, 0.0), 0.02)])
    np.testing.assert_array_equal(guarded.points, plain.points)
    np.testing.assert_array_equal(guarded.triangles, plain.triangles)
    assert guarded.seam_names == ("rib",)


def test_errors_come_back_as_they_were_raised():
    outline = Outline.polygon([(0, 0), (1, 0), (1, 1), (0, 1)])
    with pytest.raises(InputError, match="the mesh size is -1 m"):
        mesh_guarded(outline, size=-1.0)


def test_a_step_file_is_read_by_the_second_process(tmp_path):
    path = tmp_path / "nowhere.step"
    with pytest.raises(InputError, match=r"nowhere\.step"):
        read_step_guarded(path)
    damaged = tmp_path / "damaged.step"
    damaged.write_text("ISO-10303-21; HEADER; ENDSEC; DATA; #1=; ENDSEC;", "utf-8")
    with pytest.raises(InputError, match=r"damaged\.step"):
        read_step_guarded(damaged)
    with pytest.raises(MeshError, match=r"back within 0\.01 s, reading"):
        read_step_guarded(damaged, seconds=0.01)
