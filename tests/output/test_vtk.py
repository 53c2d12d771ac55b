"""VTU files as PyVista reads them."""

from dataclasses import replace

import meshio
import numpy as np
import pytest
import pyvista

from kplate.adapt import solve
from kplate.errors import InputError
from kplate.loads import Pressure
from kplate.materials import STEEL
from kplate.meshfiles import read_vtu
from kplate.outline import Outline
from kplate.output.vtk import write_vtk
from kplate.plate import Plate
from kplate.solution import Solution
from kplate.supports import SIMPLY_SUPPORTED


def renamed(solution, *names):
    """The same solution with other names for its cases."""
    cases = [
        replace(case, name=name)
        for case, name in zip(solution.state.cases, names, strict=True)
    ]
    return Solution(state=replace(solution.state, cases=tuple(cases)))


def test_points_and_cells_come_back_as_they_are(cover, tmp_path):
    samples, path = cover.samples, tmp_path / "cover.vtu"
    assert write_vtk(cover, path) == path
    found = pyvista.read(path)
    assert found.points.dtype == np.float64
    np.testing.assert_array_equal(found.points[:, :2], samples.points)
    assert not found.points[:, 2].any()
    n, m = len(samples.triangles), len(samples.rim)
    kinds = np.repeat([pyvista.CellType.TRIANGLE, pyvista.CellType.LINE], [n, m])
    np.testing.assert_array_equal(found.celltypes, kinds)
    triangles = np.c_[np.full(n, 3), samples.triangles].ravel()
    lines = np.c_[np.full(m, 2), samples.rim].ravel()
    np.testing.assert_array_equal(found.cells, np.concatenate([triangles, lines]))


def test_every_field_of_every_case_is_there_in_single_precision(cover, tmp_path):
    found = pyvista.read(write_vtk(cover, tmp_path / "cover.vtu"))
    expected = {
        f"{case}: {name}": values
        for case in ("crowd", "jack")
        for name, values in cover.point_fields(case=case).items()
    }
    assert sorted(found.point_data.keys()) == sorted(expected)
    for name, values in expected.items():
        assert found.point_data[name].dtype == np.float32
        np.testing.assert_array_equal(
            found.point_data[name], values.astype(np.float32), err_msg=name
        )


def test_one_case_keeps_the_names_of_its_fields(lid, tmp_path):
    found = pyvista.read(write_vtk(lid, tmp_path / "lid.vtu"))
    fields = lid.point_fields()
    assert sorted(found.point_data.keys()) == sorted(fields)
    np.testing.assert_array_equal(
        found.point_data["deflection [m]"], np.float32(fields["deflection [m]"])
    )


def test_cells_carry_zone_thickness_and_side(cover, tmp_path):
    mesh, samples = cover.mesh, cover.samples
    found = pyvista.read(write_vtk(cover, tmp_path / "cover.vtu"))
    n, m = len(samples.triangles), len(samples.rim)
    assert sorted(found.cell_data.keys()) == [
        "side",
        "thickness [m]",
        "triangle",
        "zone",
    ]
    np.testing.assert_array_equal(
        found.cell_data["zone"], np.r_[mesh.zones[samples.owners], np.full(m, -1)]
    )
    np.testing.assert_array_equal(
        found.cell_data["side"],
        np.r_[np.full(n, -1), mesh.boundary_sides[samples.rim_owners]],
    )
    np.testing.assert_array_equal(
        found.cell_data["triangle"], np.r_[samples.owners, np.full(m, -1)]
    )
    thickness = found.cell_data["thickness [m]"]
    np.testing.assert_array_equal(thickness, np.repeat([0.012, 0.0], [n, m]))
    # The lines of a side lie on it: those of the shaft on its circle.
    shaft = found.cell_data["side"][n:] == mesh.side_names.index("shaft")
    ends = found.points[found.cells[4 * n :].reshape(-1, 3)[shaft, 1:], :2]
    np.testing.assert_allclose(np.hypot(*(ends - (0.45, 0.4)).T), 0.12, rtol=1e-12)


def test_names_with_signs_and_letters_of_any_kind_come_back(cover, tmp_path):
    names = ('5 kN/m² <up> & "down"', "Wind é, ß, 風: 1")
    found = pyvista.read(write_vtk(renamed(cover, *names), tmp_path / "a.vtu"))
    for name in names:
        assert f"{name}: deflection [m]" in found.point_data.keys()  # noqa: SIM118


def test_a_name_that_xml_cannot_hold_is_refused(cover, tmp_path):
    path = tmp_path / "a.vtu"
    with pytest.raises(InputError) as caught:
        write_vtk(renamed(cover, "a\x01b", "c"), path)
    assert str(caught.value) == (
        "the name 'a\\x01b: deflection [m]' cannot stand in a VTU file; use letters, "
        "digits and signs that can be printed."
    )
    assert list(tmp_path.iterdir()) == []


def test_a_file_by_another_name_is_refused(lid, tmp_path):
    with pytest.raises(InputError) as caught:
        write_vtk(lid, tmp_path / "lid.vtk")
    assert str(caught.value) == (
        f"'{tmp_path / 'lid.vtk'}' does not end in .vtu, which tells programs its "
        "format; name it so."
    )


def test_zones_carry_their_own_thickness(deck, tmp_path):
    found = read_vtu(write_vtk(deck, tmp_path / "a.vtu"))
    zones, thickness = (found.cell_data[n][0] for n in ("zone", "thickness [m]"))
    pad = zones == 1
    assert pad.any()
    assert set(thickness[pad]) == {0.012}
    assert set(thickness[~pad]) == {0.008}


def test_a_file_takes_a_third_of_what_plain_doubles_take(cover, tmp_path):
    path = write_vtk(cover, tmp_path / "a.vtu")
    fields = [v for c in cover.cases for v in cover.point_fields(case=c).values()]
    numbers = sum(v.size for v in fields) + cover.field_points.size
    assert path.stat().st_size < 8 * numbers * 4 / 3 / 2.5  # base64: 4 for 3


def test_balanced_fields_are_written_beside_the_others(tmp_path):
    points = [(0, 0), (0.8, 0), (0.8, 0.6), (0, 0.6)]
    sides = ["south", "east", "north", "west"]
    plate = Plate(
        outline=Outline.polygon(points, sides=sides),
        thickness=0.006,
        material=STEEL,
        supports=dict.fromkeys(sides, SIMPLY_SUPPORTED),
    )
    solution = solve(plate, [Pressure(-5e3)], triangles=60, balanced=True)
    data = read_vtu(write_vtk(solution, tmp_path / "a.vtu")).point_data
    for name in ("moments [N]", "shears [N per m]", "deflection [m]"):
        own, other = data[name], data[f"balanced {name}"]
        assert own.shape == other.shape
        off = np.abs(own - other).max() / np.abs(own).max()
        assert 0.0 < off < 0.2, name  # two ways to the same field


def test_the_same_solution_gives_the_same_bytes(lid, tmp_path):
    first = write_vtk(lid, tmp_path / "a.vtu").read_bytes()
    assert write_vtk(lid, tmp_path / "b.vtu").read_bytes() == first


def test_a_failing_writer_leaves_the_old_file(lid, tmp_path, monkeypatch):
    path = write_vtk(lid, tmp_path / "lid.vtu")
    old = path.read_bytes()

    def fail(name, *_, **__):
        name.write_text("half")
        raise RuntimeError("half way")

    monkeypatch.setattr(meshio.vtu, "write", fail)
    with pytest.raises(RuntimeError, match="half way"):
        write_vtk(lid, path)
    assert path.read_bytes() == old
    assert list(tmp_path.iterdir()) == [path]


def test_what_is_written_is_read_back(cover, tmp_path):
    mesh, samples = cover.mesh, cover.samples
    found = read_vtu(write_vtk(cover, tmp_path / "cover.vtu"))
    np.testing.assert_array_equal(found.points[:, :2], samples.points)
    np.testing.assert_array_equal(found.triangles, samples.triangles)
    np.testing.assert_array_equal(found.lines, samples.rim)
    zones, sides = found.cell_data["zone"][0], found.cell_data["side"][1]
    np.testing.assert_array_equal(zones, mesh.zones[samples.owners])
    np.testing.assert_array_equal(sides, mesh.boundary_sides[samples.rim_owners])
    for name, values in cover.point_fields(case="jack").items():
        np.testing.assert_array_equal(
            found.point_data[f"jack: {name}"], values.astype(np.float32)
        )


@pytest.mark.parametrize("old", ["NumberOfPoints", "NumberOfCells"])
def test_a_wrong_count_is_damage(lid, tmp_path, old):
    path = write_vtk(lid, tmp_path / "lid.vtu")
    path.write_text(path.read_text().replace(f'{old}="', f'{old}="9', 1))
    with pytest.raises(InputError) as caught:
        read_vtu(path)
    assert str(caught.value) == (
        f"'{path}' is damaged, or not of triangles and lines; run kplate check again."
    )


def test_cells_of_points_that_are_not_there_are_damage(lid, tmp_path):
    path = write_vtk(lid, tmp_path / "lid.vtu")
    lines = path.read_text().splitlines()
    k = next(i for i, line in enumerate(lines) if 'Name="connectivity"' in line) + 1
    lines[k] = lines[k][:200] + "QUFB" * 60 + lines[k][440:]
    path.write_text("\n".join(lines))
    with pytest.raises(InputError, match="is damaged"):
        read_vtu(path)
