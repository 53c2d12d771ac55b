"""Timings, as ratios measured in one run: machines differ and are noisy.

Run with one BLAS thread; the solver caps its own.
"""

import resource
import subprocess
import sys
import tempfile
import time
from collections.abc import Callable
from pathlib import Path
from typing import Any

import numpy as np
from threadpoolctl import threadpool_limits

import kplate as kp
from benchmarks import cases, records
from kplate import assembly
from kplate.boundary import constrain
from kplate.dofs import Numbering
from kplate.elements import ELEMENTS
from kplate.loads import Case
from kplate.mesh import Mesh
from kplate.meshing import mesh_outline, size_for
from kplate.solve.static import solve_static

UNKNOWNS = (10_000, 100_000, 300_000)
ROOT = Path(__file__).parents[1]


def main() -> None:
    """Print all timings."""
    solver()
    errors()
    command()


def solver() -> None:
    """Whole solve against one bare CHOLMOD factorisation of the same matrix."""
    print("solve without meshing; 1.0 is one bare CHOLMOD factorisation of the matrix")
    print("unknowns  factorisation  whole solve  stiffness and assembly  peak memory")
    for unknowns in UNKNOWNS:
        plate = cases.plate(records.record("ssss_u_1"))
        mesh = mesh_outline(
            plate.outline, size=size_for(plate.outline, int(unknowns / 1.5))
        )
        case = Case(name="uniform", loads=[kp.Pressure(-1.0)])
        bare, matrix_time = _parts(plate, mesh)
        whole = _best(lambda p=plate, m=mesh, c=case: solve_static(p, m, [c]))  # type: ignore[misc]
        memory = resource.getrusage(resource.RUSAGE_SELF).ru_maxrss / 2**20
        print(
            f"{3 * len(mesh.points):8d}  {bare:11.3f} s  {whole / bare:11.2f}  "
            f"{100.0 * matrix_time / whole:20.0f} %  {memory:8.2f} GiB"
        )


def _parts(plate: kp.Plate, mesh: Mesh) -> tuple[float, float]:
    """Seconds of a bare factorisation, and of stiffness and assembly."""
    from cvxopt import cholmod, matrix, spmatrix

    element = ELEMENTS["dkt"]
    numbering = Numbering(
        mesh=mesh, per_vertex=element.per_vertex, per_edge=element.per_edge
    )
    constraints = constrain(plate, numbering)
    made = _best(lambda: assembly.stiffness(plate, element, constraints))
    lower = assembly.stiffness(plate, element, constraints)
    columns = np.repeat(np.arange(lower.shape[1]), np.diff(lower.indptr))
    A = spmatrix(
        matrix(lower.data),
        matrix(lower.indices.astype(np.int64)),
        matrix(columns.astype(np.int64)),
        lower.shape,
    )

    def bare() -> None:
        factor = cholmod.symbolic(A, uplo="L")
        cholmod.numeric(A, factor)

    with threadpool_limits(limits=1):
        return _best(bare), made


def errors() -> None:
    """Error against unknowns on the simply supported and the clamped square."""
    print("\nerror against unknowns, unstructured meshes")
    print("case       unknowns   deflection  centre moment  edge: reaction or moment")
    for name, edge in (("ssss_u_1", "line reaction"), ("cccc_u_1", "m_yy")):
        problem = records.record(name)
        for triangles in (500, 2_000, 8_000, 32_000):
            plate = cases.plate(problem)
            solution = kp.solve(plate, cases.loads(problem), triangles=triangles)
            wanted = {(q["quantity"], tuple(q["at"])): q for q in problem["quantities"]}
            found = []
            for key in (
                ("deflection", (0.5, 0.5)),
                ("m_xx", (0.5, 0.5)),
                (edge, (0.5, 0.0)),
            ):
                value = wanted[key]["value"]
                found.append(cases.computed(solution, wanted[key]) / value - 1.0)
            shown = "  ".join(f"{100.0 * error:+10.3f} %" for error in found)
            print(f"{name:10s} {3 * len(solution.mesh.points):8d}  {shown}")


def command() -> None:
    """Whole time of a command against starting Python with Gmsh and SciPy."""
    panel = ROOT / "meshes" / "pit-cover.toml"
    with tempfile.TemporaryDirectory() as out:
        whole = _command("-m", "kplate", "check", str(panel), "--out", out)
    start = _command("-c", "import gmsh, numpy, scipy.sparse")
    light = _command("-c", "import kplate")
    base = _command("-c", "import numpy, scipy.sparse")
    print(f"\nkplate check meshes/pit-cover.toml: {whole:.2f} s")
    print(f"python -c 'import gmsh, numpy, scipy.sparse': {start:.2f} s")
    print(f"import kplate / import numpy, scipy.sparse: {light / base:.2f}")


def _command(*arguments: str) -> float:
    """Seconds of a Python process, the best of three."""
    return _best(
        lambda: subprocess.run(
            [sys.executable, *arguments], check=True, capture_output=True
        )
    )


def _best(run: Callable[[], Any]) -> float:
    """Seconds of the best of three runs."""
    times = []
    for _ in range(3):
        start = time.perf_counter()
        run()
        times.append(time.perf_counter() - start)
    return min(times)
