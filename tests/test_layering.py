"""Modules import downward only; heavy libraries stay out of ``import kplate``."""

import ast
import subprocess
import sys
from pathlib import Path

import pytest

import kplate

LAYERS = [  # ground floor first; those on one line do not import each other
    {"errors", "arrays"},
    {"values", "quadrature", "materials", "curves", "linalg", "woodarmer"},
    {"units", "files", "given", "chords", "fitting", "handbook", "hermite"},
    {"quantities"},
    {"fields"},
    {"polygon"},
    {"shapes", "placement", "joining", "chaining", "rounding"},
    {"interior"},
    {"outline", "cutting", "entities"},
    {"mesh", "sampling", "sizefields"},
    {"supports", "loads", "stock"},
    {"combinations"},
    {"elements", "corners", "meshing", "drawings", "tracing", "meshgroups", "describe"},
    {"meshfiles", "vertices", "dxf", "step", "refine"},
    {"guard"},
    {"outlinefiles"},
    {"plate"},
    {"dofs", "choice", "roundedges", "surrounding"},
    {"boundary", "singular", "pattern"},
    {"assembly", "loading"},
    {"solve", "unbalanced"},
    {"samples"},
    {"recovery"},
    {"stations", "rims", "heldedges"},
    {"traces"},
    {"answers", "raw", "peaks", "goals", "kernels", "tracelines"},
    {"dualforces", "rimkernels", "clearance"},
    {"reactions", "functionals"},
    {"kernelled", "brackets", "worth", "coarser", "pointforces"},
    {"bands"},
    {"solved", "summits"},
    {"searched"},
    {"solution", "following", "influence"},
    {"combining", "limits"},
    {"extremes", "asking", "patches"},
    {"certifying", "basis"},
    {"adapt", "superposed", "sensitivity"},
    {"validity", "judging", "independent", "roaming", "presets"},
    {"sizing", "envelope"},
    {"output"},
    {"statements", "outlines", "caseloads"},
    {"limitfields", "combinationfields"},
    {"panel"},
    {"checklines", "limitwords"},
    {"asklines", "placing", "comparing", "heading"},
    {"check"},
    {"choosing"},
    {"cli"},
    {"__main__"},
]
LEVEL = {name: level for level, names in enumerate(LAYERS) for name in names}
ROOT = Path(kplate.__file__).parent
FILES = [f for f in sorted(ROOT.rglob("*.py")) if f != ROOT / "__init__.py"]


def imported(path):
    """Full names of everything a file imports, inside functions too."""
    for node in ast.walk(ast.parse(path.read_text("utf-8"))):
        if isinstance(node, ast.Import):
            yield from (alias.name for alias in node.names)
        elif isinstance(node, ast.ImportFrom):
            assert node.level == 0, "imports are absolute"
            if node.module == "kplate":
                yield from (f"kplate.{alias.name}" for alias in node.names)
            else:
                yield node.module


@pytest.mark.parametrize("path", FILES, ids=lambda p: str(p.relative_to(ROOT)))
def test_imports_point_down(path):
    here = path.relative_to(ROOT).with_suffix("").parts[0]
    for name in imported(path):
        package, *rest = name.split(".")
        if package == "kplate":
            assert rest, "import from the module, not from kplate"
            assert rest[0] == here or LEVEL[rest[0]] < LEVEL[here]


def test_heavy_libraries_stay_with_their_owners():
    owners = {
        "ezdxf": {"dxf.py"},
        "gmsh": {"meshing.py"},
        "meshio": {"meshfiles.py"},
        "cvxopt": {"linalg.py"},
        "pint": {"quantities.py"},
        "pyvista": {"chart.py", "props.py", "stage.py", "view.py", "window.py"},
        "matplotlib": {
            "asked.py",
            "colours.py",
            "contours.py",
            "history.py",
            "lettering.py",
            "picture.py",
            "plot.py",
            "plan.py",
            "props.py",
            "shape.py",
            "surface.py",
        },
        "rich": {"tables.py"},
        "shapely": {
            "cutting.py",
            "drawings.py",
            "interior.py",
            "mesh.py",
            "outline.py",
            "placement.py",
            "polygon.py",
        },
    }
    for library, names in owners.items():
        users = {
            f.name for f in FILES for m in imported(f) if m.split(".")[0] == library
        }
        assert users == names, library


def test_import_kplate_stays_light():
    heavy = (
        "gmsh meshio ezdxf pyvista vtk vtkmodules matplotlib shapely pint rich cvxopt"
    )
    code = (
        f"import sys, kplate; print(*[m for m in {heavy.split()} if m in sys.modules])"
    )
    run = subprocess.run(
        [sys.executable, "-c", code], capture_output=True, text=True, check=True
    )
    assert run.stdout.split() == []


def test_public_names_are_listed_sorted_and_there():
    names = kplate.__all__
    assert len(set(names)) == len(names)
    for kind in (
        str.isupper,
        lambda n: not n.isupper() and n[0].isupper(),
        str.islower,
    ):
        own = [n for n in names if kind(n)]
        assert own == sorted(own)
    for name in names:
        assert getattr(kplate, name).__doc__, name
