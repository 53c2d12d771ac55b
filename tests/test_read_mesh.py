"""Meshes from files: all formats read alike, groups by name, refusals in words."""

import math
from dataclasses import replace

import meshio
import numpy as np
import pytest

from kplate.errors import InputError
from kplate.mesh import STRAIGHT_EDGE
from kplate.meshfiles import read_mesh, write_vtu
from kplate.meshing import gmsh_model, mesh_outline
from kplate.outline import Outline
from kplate.shapes import Circle, Slot
from kplate.tracing import outline_of, with_circles

FORMATS = [(2.2, 0), (2.2, 1), (4.1, 0), (4.1, 1)]


def refusal(read):
    """The message with which something is refused."""
    with pytest.raises(InputError) as caught:
        read()
    return str(caught.value)


def write_panel(path, version, binary, *, turn=None, order=1, name_all=True):
    """A plate of 1.2 x 0.9 with a round hole, an inner zone, a seam and a mark."""
    with gmsh_model(0.06) as gmsh:
        model, occ = gmsh.model, gmsh.model.occ
        plate = occ.addRectangle(0, 0, 0, 1.2, 0.9)
        hole = occ.addDisk(0.3, 0.45, 0, 0.1, 0.1)
        cut, _ = occ.cut([(2, plate)], [(2, hole)])
        pad = (2, occ.addRectangle(0.7, 0.3, 0, 0.3, 0.3))
        line = (1, occ.addLine(occ.addPoint(0.5, 0.1, 0), occ.addPoint(0.5, 0.8, 0)))
        mark = (0, occ.addPoint(0.6, 0.2, 0))
        _, parts = occ.fragment(cut, [pad, line, mark])
        if turn:
            occ.rotate(occ.getEntities(2), 0, 0, 0, 1, 0, 0, turn)
        occ.synchronize()
        own = {tag for _, tag in parts[1]}
        rest = [tag for _, tag in parts[0] if tag not in own]
        model.addPhysicalGroup(2, sorted(own), name="pad")
        model.addPhysicalGroup(2, rest, name="sheet")
        sides = {"west": [], "round": [], "others": []}
        edges = model.getBoundary(model.getEntities(2), oriented=False)
        for _, tag in edges:
            x0, _, _, x1, _, _ = model.getBoundingBox(1, tag)
            inside = x0 > 0.1 and x1 < 0.45
            if inside:
                model.mesh.setTransfiniteCurve(abs(tag), 49)
            kind = "round" if inside else "west" if x1 < 0.01 else "others"
            sides[kind].append(tag)
        for name, tags in sides.items():
            if name != "west" or name_all:
                model.addPhysicalGroup(1, tags, name=name)
        model.addPhysicalGroup(1, [t for _, t in parts[2]], name="rib line")
        model.addPhysicalGroup(0, [t for _, t in parts[3]], name="probe")
        gmsh.option.setNumber("Mesh.ElementOrder", order)
        model.mesh.generate(2)
        saved = {
            key: gmsh.option.getNumber(key)
            for key in ("Mesh.MshFileVersion", "Mesh.Binary")
        }
        gmsh.option.setNumber("Mesh.MshFileVersion", version)
        gmsh.option.setNumber("Mesh.Binary", binary)
        gmsh.write(str(path))
        for key, value in saved.items():
            gmsh.option.setNumber(key, value)
    return path


@pytest.fixture(scope="module")
def panels(tmp_path_factory):
    """The panel in all four formats."""
    folder = tmp_path_factory.mktemp("meshes")
    return [
        write_panel(folder / f"{version}-{binary}.msh", version, binary)
        for version, binary in FORMATS
    ]


def by_name(mesh):
    """What does not depend on the order of points, by the names of groups."""
    middles = mesh.points[mesh.boundary_edges].mean(axis=1)
    sides = {
        name: sorted(map(tuple, middles[mesh.boundary_sides == k].round(9).tolist()))
        for k, name in enumerate(mesh.side_names)
    }
    zones = {
        name: float(mesh.areas[mesh.zones == k].sum())
        for k, name in enumerate(mesh.zone_names)
    }
    seams = {
        name: sorted(
            map(
                tuple,
                mesh.points[mesh.seam_edges[mesh.seam_numbers == k]]
                .mean(axis=1)
                .round(9)
                .tolist(),
            )
        )
        for k, name in enumerate(mesh.seam_names)
    }
    return sides, zones, seams


def test_all_formats_of_gmsh_read_alike(panels):
    meshes = [read_mesh(path) for path in panels]
    first = meshes[0]
    assert set(first.side_names) == {"west", "round", "others"}
    assert set(first.zone_names) == {"plate", "pad", "sheet"}
    assert first.seam_names == ("rib line",)
    assert first.mark_names == ("probe",)
    np.testing.assert_allclose(first.points[first.mark_vertices[0]], (0.6, 0.2))
    sides, zones, seams = by_name(first)
    assert zones["pad"] == pytest.approx(0.09)
    assert zones["plate"] == 0.0
    assert len(sides["round"]) == 48
    hole = 24.0 * 0.1**2 * math.sin(math.pi / 24.0)
    assert first.area == pytest.approx(1.2 * 0.9 - hole, rel=1e-9)
    for other in meshes[1:]:
        other_sides, other_zones, other_seams = by_name(other)
        assert other_sides == sides
        assert other_seams == seams
        assert other_zones == pytest.approx(zones)


def test_the_outline_is_traced_and_edges_know_their_circle(panels):
    mesh = read_mesh(panels[3])
    outline = outline_of(mesh)
    assert outline.area == pytest.approx(1.2 * 0.9 - math.pi * 0.1**2, rel=1e-9)
    assert sorted(map(tuple, outline.rim.points.round(9).tolist())) == [
        (0.0, 0.0),
        (0.0, 0.9),
        (1.2, 0.0),
        (1.2, 0.9),
    ]
    assert outline.side_length("west") == pytest.approx(0.9)
    on_circle = mesh.boundary_circles != STRAIGHT_EDGE
    round_side = mesh.side_names.index("round")
    np.testing.assert_array_equal(on_circle, mesh.boundary_sides == round_side)
    x, y, radius = mesh.circles[mesh.boundary_circles[on_circle]].T
    assert x == pytest.approx(0.3)
    assert y == pytest.approx(0.45)
    assert radius == pytest.approx(0.1)


def test_a_mesh_of_our_own_is_traced_to_its_outline():
    outline = (
        Outline.polygon(
            [(0, 0), (2, 0), (2, 1), (1, 1), (1, 2), (0, 2)],
            bulges=[0, 0.3, 0, -0.2, 0, 0],
        )
        .part("side-1", name="door", fractions=(0.25, 0.5))
        .cut(Circle(centre=(0.5, 0.5), radius=0.2, name="eye"))
    )
    mesh = mesh_outline(outline, size=0.1)
    bare = replace(mesh, boundary_circles=None, circles=())
    for traced in (outline_of(mesh), outline_of(bare)):
        assert set(traced.side_names) == set(outline.side_names)
        assert traced.area == pytest.approx(outline.area, rel=1e-9)
        for side in outline.side_names:
            assert traced.side_length(side) == pytest.approx(
                outline.side_length(side), rel=1e-9
            )
        for line, stated in zip(traced.boundaries, outline.boundaries, strict=True):
            assert len(line.points) == len(stated.points)
    again = with_circles(bare, outline_of(bare))
    np.testing.assert_allclose(
        again.circles[again.boundary_circles],
        mesh.circles[mesh.boundary_circles],
        rtol=1e-9,
    )
    np.testing.assert_array_equal(again.boundary_circles < 0, mesh.boundary_circles < 0)


def test_arcs_and_straight_pieces_of_one_side_are_told_apart():
    outline = Outline.of(
        Slot(centre=(0.0, 0.0), length=2.0, width=1.0, name="rim", angle=0.4)
    )
    mesh = mesh_outline(outline, size=0.1)
    bare = replace(mesh, boundary_circles=None, circles=())
    assert (bare.boundary_circles == STRAIGHT_EDGE).all()
    read = with_circles(bare, outline_of(bare))
    np.testing.assert_allclose(
        read.circles[read.boundary_circles[read.boundary_circles >= 0]],
        mesh.circles[mesh.boundary_circles[mesh.boundary_circles >= 0]],
        atol=1e-9,
    )
    np.testing.assert_array_equal(read.boundary_circles < 0, mesh.boundary_circles < 0)


def test_the_unit_scales_the_mesh(panels):
    mesh = read_mesh(panels[0], unit="mm")
    assert outline_of(mesh).box == pytest.approx((0.0, 0.0, 1.2e-3, 0.9e-3))


def as_vtu(path, mesh, *, groups):
    """Write a mesh with a 0/1 array for each group."""
    n, m = len(mesh.triangles), len(mesh.boundary_edges)
    cells = {
        name: (np.zeros(n, dtype=int), (mesh.boundary_sides == k).astype(int))
        for k, name in enumerate(mesh.side_names)
        if name in groups
    }
    cells["left half"] = (
        (mesh.points[mesh.triangles].mean(axis=1)[:, 0] < 0.5).astype(int),
        np.zeros(m, dtype=int),
    )
    points = np.column_stack([mesh.points, np.full(len(mesh.points), 3.0)])
    write_vtu(
        path,
        points,
        mesh.triangles,
        lines=mesh.boundary_edges,
        point_data={},
        cell_data=cells,
    )
    return path


SQUARE = Outline.polygon(
    [(0, 0), (1, 0), (1, 1), (0, 1)], sides=["south", "east", "north", "west"]
)


def test_a_vtu_file_with_an_array_for_each_group(tmp_path):
    mesh = mesh_outline(SQUARE, size=0.2)
    path = as_vtu(tmp_path / "a.vtu", mesh, groups=SQUARE.side_names)
    read = read_mesh(path)
    assert by_name(read)[0] == by_name(mesh)[0]
    assert read.zone_names == ("plate", "left half")
    assert outline_of(read).rim.perimeter == pytest.approx(4.0)


def test_a_vtu_file_with_numbers_for_groups(tmp_path):
    mesh = mesh_outline(SQUARE, size=0.2)
    n, m = len(mesh.triangles), len(mesh.boundary_edges)
    path = tmp_path / "a.vtu"
    write_vtu(
        path,
        np.column_stack([mesh.points, np.zeros(len(mesh.points))]),
        mesh.triangles,
        lines=mesh.boundary_edges,
        point_data={},
        cell_data={
            "side": (np.full(n, -1), mesh.boundary_sides),
            "zone": (np.zeros(n, dtype=int), np.full(m, -1)),
        },
    )
    read = read_mesh(path)
    assert set(read.side_names) == {"side-1", "side-2", "side-3", "side-4"}
    assert read.zone_names == ("plate", "zone-1")


# Refusals


def test_a_side_without_a_group_says_where(tmp_path):
    path = write_panel(tmp_path / "a.msh", 4.1, 1, name_all=False)
    message = refusal(lambda: read_mesh(path))
    assert message.startswith("15 of ")
    assert "boundary edges belong to no named group of lines, the first near (0, " in (
        message
    )
    assert message.endswith(
        "; name every side, or close the crack where nodes are double."
    )


def test_a_vtu_file_without_a_group_says_where(tmp_path):
    mesh = mesh_outline(SQUARE, size=0.5)
    path = as_vtu(tmp_path / "a.vtu", mesh, groups=("south", "east", "north"))
    assert refusal(lambda: read_mesh(path)).startswith(
        "2 of 8 boundary edges belong to no named group of lines, the first near (0, "
    )


def test_a_tilted_mesh_is_refused(tmp_path):
    path = write_panel(tmp_path / "a.msh", 4.1, 1, turn=0.3)
    assert refusal(lambda: read_mesh(path)) == (
        "the mesh is not flat: z runs from 0 to 0.265968 in its own unit; turn the "
        "panel into the xy plane."
    )


def test_second_order_is_refused(tmp_path):
    path = write_panel(tmp_path / "a.msh", 4.1, 1, order=2)
    message = refusal(lambda: read_mesh(path))
    assert "cells of second or higher order; kplate takes triangles and lines" in (
        message
    )


def small(cells, *, points=None, **rest):
    points = [(0, 0, 0), (1, 0, 0), (1, 1, 0), (0, 1, 0)] if points is None else points
    return meshio.Mesh(np.array(points, dtype=float), cells, **rest)


TRIANGLES = ("triangle", np.array([(0, 1, 2), (0, 2, 3)]))
EDGES = [(0, 1), (1, 2), (2, 3), (3, 0)]


def written(path, mesh):
    meshio.vtu.write(path, mesh, compression=None)
    return path


def test_quadrangles_are_refused(tmp_path):
    mesh = small([("quad", np.array([(0, 1, 2, 3)]))])
    assert refusal(lambda: read_mesh(written(tmp_path / "a.vtu", mesh))) == (
        "the mesh holds 1 cells of kind 'quad'; kplate takes triangles and lines of "
        "the first order. Mesh again without quadrangles and solids."
    )


def test_a_mesh_without_triangles_is_refused(tmp_path):
    mesh = small([("line", np.array(EDGES))])
    assert refusal(lambda: read_mesh(written(tmp_path / "a.vtu", mesh))) == (
        "the mesh holds no triangles; where lines have names, so must surfaces, or "
        "they are not saved."
    )


def test_an_edge_or_triangle_of_two_groups_is_refused(tmp_path):
    def read(sides, zones):
        data = {name: [np.zeros(2, int), np.array(own)] for name, own in sides.items()}
        data |= {name: [np.array(own), np.zeros(4, int)] for name, own in zones.items()}
        mesh = small([TRIANGLES, ("line", np.array(EDGES))], cell_data=data)
        return refusal(lambda: read_mesh(written(tmp_path / "a.vtu", mesh)))

    assert read({"rim": [1, 1, 1, 1], "west": [0, 0, 0, 1]}, {}) == (
        "the boundary edge at (0, 0.5) m is in the groups 'rim' and 'west'; it belongs "
        "to one."
    )
    message = read({"rim": [1, 1, 1, 1]}, {"all": [1, 1], "half": [1, 0]})
    assert message.startswith("the triangle at (0.666667, 0.333333) m is in the groups")


def test_a_group_on_the_boundary_and_inside_is_refused(tmp_path):
    lines = ("line", np.array([*EDGES, (0, 2)]))
    data = {"all": [np.zeros(2, dtype=int), np.ones(5, dtype=int)]}
    mesh = small([TRIANGLES, lines], cell_data=data)
    assert refusal(lambda: read_mesh(written(tmp_path / "a.vtu", mesh))) == (
        "group 'all' has lines on the boundary and inside; name them apart."
    )


def test_clockwise_triangles_and_loose_points_are_put_right(tmp_path):
    points = [(0, 0, 0), (1, 0, 0), (1, 1, 0), (0, 1, 0), (5, 5, 5)]
    triangles = ("triangle", np.array([(0, 2, 1), (0, 2, 3)]))
    data = {"rim": [np.zeros(2, dtype=int), np.ones(4, dtype=int)]}
    mesh = small([triangles, ("line", np.array(EDGES))], points=points, cell_data=data)
    read = read_mesh(written(tmp_path / "a.vtu", mesh))
    assert read.area == pytest.approx(1.0)
    assert len(read.points) == 4


def test_groups_whose_lines_run_the_other_way_and_without_a_name(tmp_path):
    path = tmp_path / "a.msh"
    lines = "".join(
        f"{k + 1} 1 2 -7 1 {a + 1} {b + 1}\n" for k, (a, b) in enumerate(EDGES)
    )
    path.write_text(
        "$MeshFormat\n2.2 0 8\n$EndMeshFormat\n"
        "$Nodes\n4\n1 0 0 0\n2 1 0 0\n3 1 1 0\n4 0 1 0\n$EndNodes\n"
        f"$Elements\n6\n{lines}5 2 2 3 1 1 2 3\n6 2 2 3 1 1 3 4\n$EndElements\n"
    )
    mesh = read_mesh(path)
    assert mesh.side_names == ("side-7",)
    assert mesh.zone_names == ("plate", "zone-3")


def test_two_parts_are_refused(tmp_path):
    points = [(0, 0, 0), (1, 0, 0), (1, 1, 0), (5, 0, 0), (6, 0, 0), (6, 1, 0)]
    triangles = ("triangle", np.array([(0, 1, 2), (3, 4, 5)]))
    lines = ("line", np.array([(0, 1), (1, 2), (2, 0), (3, 4), (4, 5), (5, 3)]))
    data = {"rim": [np.zeros(2, dtype=int), np.ones(6, dtype=int)]}
    mesh = small([triangles, lines], points=points, cell_data=data)
    assert refusal(lambda: read_mesh(written(tmp_path / "a.vtu", mesh))) == (
        "the mesh is in 2 parts, one of them near (5, 0) m; a panel is in one."
    )


def test_files_that_are_no_meshes_are_refused_by_name(tmp_path):
    def said(name, content=None):
        path = tmp_path / name
        if content is not None:
            path.write_bytes(content)
        return refusal(lambda: read_mesh(path)).replace(str(tmp_path), "")

    damaged = (
        "is damaged, of a version that cannot be read, or holds arrays of text; save "
        "it as .msh 4.1 or 2.2, or as .vtu without text."
    )
    assert said("a.stl") == "'/a.stl' is no mesh file; name a .msh or .vtu file."
    assert said("a.msh") == "there is no file '/a.msh'; name a .msh or .vtu file."
    assert said("b.msh", b"$MeshFormat\n9.9 0 8\n") == f"'/b.msh' {damaged}"
    assert said("c.msh", b"") == f"'/c.msh' {damaged}"
    assert said("d.vtu", b"<VTKFile") == f"'/d.vtu' {damaged}"
    (tmp_path / "e.msh").mkdir()
    assert said("e.msh") == "'/e.msh' is a folder; name a .msh or .vtu file."


def test_an_array_of_text_does_not_end_the_program(tmp_path):
    text = """<VTKFile type="UnstructuredGrid" version="0.1" byte_order="LittleEndian">
<UnstructuredGrid><Piece NumberOfPoints="3" NumberOfCells="1">
<FieldData><DataArray type="String" Name="note" NumberOfTuples="1" format="ascii">
65 0</DataArray></FieldData>
<Points><DataArray type="Float64" NumberOfComponents="3" format="ascii">
0 0 0 1 0 0 1 1 0</DataArray></Points>
<Cells><DataArray type="Int64" Name="connectivity" format="ascii">0 1 2</DataArray>
<DataArray type="Int64" Name="offsets" format="ascii">3</DataArray>
<DataArray type="UInt8" Name="types" format="ascii">5</DataArray></Cells>
<PointData><DataArray type="String" Name="label" format="ascii">65 0 65 0 65 0
</DataArray></PointData>
</Piece></UnstructuredGrid></VTKFile>"""
    path = tmp_path / "a.vtu"
    path.write_text(text)
    assert "holds arrays of text" in refusal(lambda: read_mesh(path))
