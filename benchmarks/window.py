"""Time and memory of the 3-D window: first picture, and frames while dragging.

A square plate bent to a double sine wave, with the fields that `kplate check` writes
for one case of DKT, is written as a .vtu file; reading it, building the scene and
drawing are timed, each size in a process of its own, off screen and in software (Mesa's
llvmpipe where there is no graphics card).
"""

import json
import resource
import subprocess
import sys
import tempfile
import time
from pathlib import Path

import numpy as np

from kplate.meshfiles import write_vtu
from kplate.recovery import principal_moments, surface_stress, von_mises

TRIANGLES = (10_000, 100_000, 500_000)
FRAMES = 10
THICKNESS, STIFFNESS, NU = 0.01, 2e4, 0.3


def main(file: Path | None = None) -> None:
    """Print the table, or measure one file in this process."""
    if file is not None:
        print(json.dumps(measure(file)))
        return
    print(
        "seconds; the last but two columns: a frame while the slider or the view is "
        "dragged, by few\ntriangles in place of many; then the same by all triangles"
    )
    print(
        "triangles  file MB  imports   read  picture    all  slider   turn  "
        "slider   turn  memory MB"
    )
    for triangles in TRIANGLES:
        with tempfile.TemporaryDirectory() as folder:
            path = Path(folder) / "plate.vtu"
            write(path, triangles)
            done = subprocess.run(
                [sys.executable, "-m", "benchmarks", "window", str(path)],
                check=True,
                capture_output=True,
                text=True,
            )
            own = json.loads(done.stdout)
            size = path.stat().st_size / 1e6
        print(
            f"{own['triangles']:9d}  {size:7.1f}  {own['imports']:7.2f}  "
            f"{own['read']:5.2f}  {own['picture']:7.2f}  {own['whole']:5.2f}  "
            f"{own['slider']:6.3f}  {own['turn']:5.3f}  "
            f"{own['slider all']:6.3f}  {own['turn all']:5.3f}  {own['memory']:9.0f}",
            flush=True,
        )


def write(path: Path, triangles: int) -> None:
    """Write a bent square plate of so many triangles."""
    n = round(np.sqrt(triangles / 2.0))
    x, y = (a.ravel() for a in np.meshgrid(*[np.linspace(0.0, 1.0, n + 1)] * 2))
    number = np.arange((n + 1) ** 2).reshape(n + 1, n + 1)
    a, b = number[:-1, :-1].ravel(), number[:-1, 1:].ravel()
    c, d = number[1:, 1:].ravel(), number[1:, :-1].ravel()
    faces = np.concatenate([np.column_stack([a, b, c]), np.column_stack([a, c, d])])
    sx, sy = np.sin(np.pi * x), np.sin(2.0 * np.pi * y)
    cx, cy = np.cos(np.pi * x), np.cos(2.0 * np.pi * y)
    w = -1e-3 * sx * sy
    w_xx, w_yy, w_xy = -(np.pi**2) * w, -4 * np.pi**2 * w, -2e-3 * np.pi**2 * cx * cy
    moments = STIFFNESS * np.column_stack(
        [w_xx + NU * w_yy, w_yy + NU * w_xx, (1 - NU) * w_xy]
    )
    fields = {
        "deflection [m]": w,
        "slopes [rad]": np.column_stack(
            [-1e-3 * np.pi * cx * sy, -2e-3 * np.pi * sx * cy]
        ),
        "moments [N]": moments,
        "principal moments [N]": principal_moments(moments)[0],
        "shears [N per m]": moments[:, :2],
        "shear stress [Pa]": np.abs(w),
        "von Mises [Pa]": von_mises(surface_stress(moments, THICKNESS, "bottom")),
    }
    for face in ("top", "bottom"):
        stress = surface_stress(moments, THICKNESS, face)  # type: ignore[arg-type]
        fields[f"stress {face} [Pa]"] = stress
        fields[f"largest principal {face} [Pa]"] = principal_moments(stress)[0][:, 0]
    rims = (number[0], number[:, -1], number[-1, ::-1], number[::-1, 0])
    lines = np.concatenate([np.column_stack([r[:-1], r[1:]]) for r in rims])
    m = len(faces)
    write_vtu(
        path,
        np.column_stack([x, y, np.zeros(len(x))]),
        faces,
        lines=lines,
        point_data={name: v.astype(np.float32) for name, v in fields.items()},
        cell_data={
            "zone": (np.zeros(m, dtype=int), np.full(len(lines), -1)),
            "side": (np.full(m, -1), np.repeat(np.arange(4), n)),
            "triangle": (np.arange(m), np.full(len(lines), -1)),
            "thickness [m]": (np.full(m, THICKNESS), np.zeros(len(lines))),
        },
    )


def measure(path: Path) -> dict[str, float]:
    """Seconds of reading, building and drawing, and the memory of it all in MB."""
    begun = time.perf_counter()
    import os

    os.environ.pop("DISPLAY", None)
    from kplate.output.result import read_result
    from kplate.output.screen import check_drawing

    check_drawing(off_screen=True)
    from kplate.output.window import Window

    imported = time.perf_counter()
    result = read_result(path)
    read = time.perf_counter()
    window = Window(result, off_screen=True)
    window.build()
    window.plotter.show(auto_close=False)
    window.plotter.screenshot(None, return_img=True)
    shown = time.perf_counter()
    memory = resource.getrusage(resource.RUSAGE_SELF).ru_maxrss / 1024.0
    stage = window.stage
    found = {}
    for words, few in (("", True), (" all", False)):
        if few:
            stage.props.drag(on=True)
        found[f"slider{words}"] = _frame(window, slides=True)
        found[f"turn{words}"] = _frame(window, slides=False)
        if few:
            stage.props.drag(on=False)
    return {
        "triangles": len(result.fields.triangles),
        "imports": imported - begun,
        "read": read - imported,
        "picture": shown - read,
        "whole": shown - begun,
        "memory": memory,
        **found,
    }


def _frame(window, *, slides: bool) -> float:  # type: ignore[no-untyped-def]
    """Seconds a frame, the mean of a few."""
    plotter, stage = window.plotter, window.stage
    scale = stage.scale
    begun = time.perf_counter()
    for k in range(FRAMES):
        if slides:
            stage.set_scale(scale * (1.0 + 0.05 * k))
        else:
            plotter.camera.azimuth += 3.0
        plotter.render()
        plotter.render_window.WaitForCompletion()
    return (time.perf_counter() - begun) / FRAMES
