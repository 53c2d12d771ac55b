"""What each element needs for an error: ``python -m benchmarks elements``.

Unknowns, and CPU seconds without meshing, at which an error falls below 1, 0.1 and
0.01 % and stays there on all finer meshes, to 50,000 unknowns. "uniform" meshes have
one size; "graded" ones are finer towards unbounded corners, as `kplate.solve` makes
them. Everything is measured in one run, so that ratios of seconds hold.
"""

import time
from collections.abc import Iterator, Sequence
from dataclasses import dataclass
from typing import Any

import numpy as np

import kplate as kp
from benchmarks import cases, records
from kplate.adapt import corner_grading
from kplate.elements import ELEMENTS
from kplate.loads import Case
from kplate.meshing import mesh_outline, size_for
from kplate.solve.static import solve_static

MOST = 50_000  # unknowns
ERRORS = (1e-2, 1e-3, 1e-4)
PROBLEMS = (
    "ssss_u_1",
    "cccc_u_1",
    "tri_eq_s_u",
    "tri_ri_s_u",
    "tri_ri_c_u",
    "rhomb_s_u_30",
    "rhomb_c_u_30",
    "lshape_S_u",
)
COUNTS = tuple(round(24 * 1.6**k) for k in range(17))  # triangles
DKT_COUNTS = (20_000, 50_000, 100_000, 200_000, 400_000)


@dataclass(frozen=True, kw_only=True)
class Need:
    """What one element needs for one quantity of one problem.

    Parameters
    ----------
    problem, meshes, element, quantity : str
        Which.
    unknowns : tuple of int or None
        For each of `ERRORS`; ``None`` where it is not reached.
    seconds : tuple of float or None
        The same in CPU seconds.
    no_value : bool
        Whether the element gives no finite value.
    """

    problem: str
    meshes: str
    element: str
    quantity: str
    unknowns: tuple[int | None, ...]
    seconds: tuple[float | None, ...]
    no_value: bool = False


def main() -> None:
    """Print the table."""
    line = "{:13s} {:8s} {:8s} {:32s}" + " {:>17s}" * len(ERRORS)
    heads = [f"to {100 * error:g} %" for error in ERRORS]
    print("unknowns and CPU seconds without meshing, to", f"{MOST:,}", "unknowns")
    print(line.format("problem", "meshes", "element", "quantity", *heads))
    for need in needs(PROBLEMS):
        cells = [
            "no value"
            if need.no_value
            else "not reached"
            if count is None
            else f"{count:,}  {seconds:.3f} s"
            for count, seconds in zip(need.unknowns, need.seconds, strict=True)
        ]
        head = (need.problem, need.meshes, need.element, need.quantity)
        print(line.format(*head, *cells), flush=True)
    clamped_moment()


def clamped_moment() -> None:
    """Print how much faster the quintic has the clamped edge moment to 0.1 %."""
    problem = records.record("cccc_u_1")
    wanted = [
        item
        for item in problem["quantities"]
        if item["quantity"] == "m_xx" and item["at"] == [0.0, 0.5]
    ]
    print("\nclamped edge moment of the square to 0.1 %, unstructured meshes:")
    seconds = {}
    for element, counts in (("quintic", COUNTS), ("dkt", DKT_COUNTS)):
        for run in _runs(problem, wanted, "uniform", element, counts, most=10**7):
            if run[2][0] <= ERRORS[1]:
                seconds[element] = run[1]
                print(
                    f"  {element}: {run[0]:,} unknowns, {run[1]:.3f} s, "
                    f"off by {100 * run[2][0]:.3f} %"
                )
                break
    if len(seconds) == 2:
        ratio = seconds["dkt"] / seconds["quintic"]
        print(f"  DKT takes {ratio:.0f} times the CPU")
    else:
        print("  DKT does not reach it")


def needs(problems: Sequence[str]) -> Iterator[Need]:
    """Measure problems, mesh family by mesh family, element by element."""
    for name in problems:
        problem = records.record(name)
        wanted = _wanted(problem)
        for meshes in ("uniform", "graded"):
            for element in ELEMENTS:
                runs = list(_runs(problem, wanted, meshes, element))
                for k, item in enumerate(wanted):
                    x, y = item["at"]
                    yield _need(
                        (name, meshes, element),
                        f"{item['quantity']} at ({x:.4g}, {y:.4g})",
                        [(unknowns, cpu, errors[k]) for unknowns, cpu, errors in runs],
                    )


def _wanted(problem: dict[str, Any]) -> list[dict[str, Any]]:
    """Quantities of the table: one of each kind, the first in the record."""
    kinds: dict[tuple[str, bool], dict[str, Any]] = {}
    outline = np.array(problem["outline"]["polygon"])
    for item in problem["quantities"]:
        inside = _inside(outline, item["at"])
        kinds.setdefault((_kind(item["quantity"]), inside), item)
    return list(kinds.values())


def _inside(outline: np.ndarray, at: Sequence[float]) -> bool:
    """Whether a place lies off the sides."""
    start, step = outline, np.roll(outline, -1, axis=0) - outline
    share = np.einsum("kc,kc->k", at - start, step) / np.einsum("kc,kc->k", step, step)
    foot = start + np.clip(share, 0.0, 1.0)[:, None] * step
    return bool(np.hypot(*(foot - at).T).min() > 1e-9)


def _runs(
    problem: dict[str, Any],
    wanted: list[dict[str, Any]],
    meshes: str,
    element: str,
    counts: Sequence[int] = COUNTS,
    most: int = MOST,
) -> Iterator[tuple[int, float, list[float]]]:
    """Unknowns, CPU seconds and errors on finer and finer meshes."""
    plate, loads = cases.plate(problem), cases.loads(problem)
    case = Case(name="load", loads=loads)
    last = 0
    for count in counts:
        mesh = mesh_outline(
            plate.outline,
            size=size_for(plate.outline, count),
            graded=corner_grading(plate) if meshes == "graded" else (),
        )
        if len(mesh.triangles) == last:
            continue
        last = len(mesh.triangles)
        start = time.process_time()
        state = solve_static(plate, mesh, [case], element=element)
        solution = kp.Solution(state=state)
        values = [cases.computed(solution, item) for item in wanted]
        cpu = time.process_time() - start
        unknowns = int(np.count_nonzero(state.constraints.free))
        if unknowns > most:
            return
        errors = [
            abs(value / item["value"] - 1.0)
            for value, item in zip(values, wanted, strict=True)
        ]
        yield unknowns, cpu, errors


def _need(
    of: tuple[str, str, str], quantity: str, runs: list[tuple[int, float, float]]
) -> Need:
    """First run from which on the error stays below each bound."""
    found: list[tuple[int | None, float | None]] = []
    for bound in ERRORS:
        first = None
        for run in reversed(runs):
            if not run[2] <= bound:
                break
            first = run
        found.append((first[0], first[1]) if first else (None, None))
    problem, meshes, element = of
    return Need(
        problem=problem,
        meshes=meshes,
        element=element,
        quantity=quantity,
        unknowns=tuple(one for one, _ in found),
        seconds=tuple(two for _, two in found),
        no_value=all(np.isnan(error) for _, _, error in runs),
    )


def _kind(quantity: str) -> str:
    return "moment" if quantity.startswith("m") else quantity
