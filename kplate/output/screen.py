"""Whether this machine can draw in 3-D and open a window.

Both are tried in another process: VTK takes the process down where an OpenGL library is
missing, and says nothing where a display does not answer.
"""

import functools
import os
import re
import subprocess
import sys
from pathlib import Path

from kplate.errors import InputError

PACKAGES = "libgl1 libegl1 libxrender1"  # of Debian and Ubuntu
PATIENCE = 120.0  # seconds
KIND = "VTK_DEFAULT_OPENGL_WINDOW"  # the environment variable by which VTK is told
WITHOUT_DISPLAY = ("vtkEGLRenderWindow", "vtkOSOpenGLRenderWindow")
_DRAW = """
import pyvista
plotter = pyvista.Plotter(off_screen=True, window_size=[16, 16])
plotter.add_mesh(pyvista.Sphere())
plotter.show()
"""
_OPEN_DISPLAY = """
import ctypes, sys
x11 = ctypes.CDLL("libX11.so.6")
x11.XOpenDisplay.restype = ctypes.c_void_p
sys.exit(x11.XOpenDisplay(None) is None)
"""


def check_window(picture: Path) -> None:
    """Refuse where no window can be opened; the message points to a picture.

    Raises
    ------
    InputError
        If there is no display, or it does not answer.
    """
    if sys.platform != "linux":
        return
    display = os.environ.get("DISPLAY")
    instead = "kplate check writes a picture (.png), which needs none."
    if picture.is_file():
        instead = f"look at the picture {str(picture)!r} instead."
    if not display:
        raise InputError(
            "no window can be opened: there is no display (DISPLAY is not set); "
            f"{instead}"
        )
    if _run(_OPEN_DISPLAY, dict(os.environ))[0] != 0:
        raise InputError(
            f"no window can be opened: the display {display!r} does not answer; "
            f"{instead}"
        )


def check_drawing(*, off_screen: bool) -> None:
    """Find a way to draw in 3-D, in a window or off screen, and tell VTK.

    Raises
    ------
    InputError
        If there is none; the message names the system packages that bring one.
    """
    _find_way(os.environ.get("DISPLAY", ""), off_screen)


@functools.cache
def _find_way(display: str, off_screen: bool) -> None:
    """Try the ways to draw with a display, or without."""
    stated = os.environ.get(KIND, "")
    ways = [stated]
    if sys.platform == "linux" and off_screen and not stated:
        ways = [*([""] if display else []), *WITHOUT_DISPLAY]
    complaint = ""
    for way in ways:
        environment = dict(os.environ) | ({KIND: way} if way else {})
        status, errors = _run(_DRAW, environment)
        if status == 0:
            if way:
                os.environ[KIND] = way
            return
        complaint = complaint or errors
    missing = re.search(r"(lib\S+?\.so[.\d]*): cannot open", complaint)
    why = f"{missing[1]} is missing" if missing else "OpenGL is missing or broken"
    raise InputError(
        f"nothing can be drawn in 3-D: {why}; install the system packages {PACKAGES} "
        "(their names on Debian and Ubuntu), or look at the picture that kplate check "
        "wrote."
    )


def _run(code: str, environment: dict[str, str]) -> tuple[int, str]:
    """Exit status and stderr of another Python that runs some code."""
    try:
        done = subprocess.run(
            [sys.executable, "-c", code],
            capture_output=True,
            text=True,
            errors="replace",
            env=environment,
            timeout=PATIENCE,
            check=False,
        )
    except subprocess.TimeoutExpired:
        return -1, ""
    return done.returncode, done.stderr
