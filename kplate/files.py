"""Files are written beside their target and then renamed.

A reader never meets half a file, and where writing fails the old file is still there.
"""

import os
import secrets
import shutil
import stat
from collections.abc import Iterator
from contextlib import contextmanager
from pathlib import Path

from kplate.errors import InputError


@contextmanager
def replacing(path: Path) -> Iterator[Path]:
    """Give a temporary file to write; put it in place when all went well.

    Parameters
    ----------
    path : Path
        The file to write, or to replace; a link is followed.

    Yields
    ------
    Path
        An empty file in the same directory. It is renamed to `path` at the end of the
        block, or removed if the block raises.

    Raises
    ------
    InputError
        If the directory is missing, the file may not be written, or the disk fails.

    Examples
    --------
    >>> import tempfile
    >>> target = Path(tempfile.mkdtemp()) / "panel.txt"
    >>> with replacing(target) as temporary:
    ...     _ = temporary.write_text("10 mm")
    >>> target.read_text()
    '10 mm'
    """
    path = Path(path)
    try:
        target = Path(os.path.realpath(path))
        _check(target, path)
        # Short, so that it is a valid name wherever the target is one.
        temporary = target.with_name(f".{secrets.token_hex(6)}.part")
        temporary.touch(exist_ok=False)
        try:
            yield temporary
            if target.exists():
                shutil.copymode(target, temporary)
            with temporary.open("rb+") as file:
                os.fsync(file.fileno())
            temporary.replace(target)
        finally:
            temporary.unlink(missing_ok=True)
    except OSError as error:
        raise InputError(
            f"cannot write {str(path)!r}: {error.strerror or error}; {_remedy(error)}."
        ) from error
    except ValueError as error:
        if "null" not in str(error):  # only a path with a zero byte is ours
            raise
        raise InputError(
            f"cannot write {str(path)!r}: {error}; name another file."
        ) from error


def _check(target: Path, path: Path) -> None:
    """Refuse what a rename would break, or do against the user's will."""
    shown = repr(str(path))
    if not target.parent.is_dir():
        raise InputError(
            f"cannot write {shown}: there is no folder {str(target.parent)!r}; make "
            "it, or name another."
        )
    if not target.exists():
        return
    if target.is_dir():
        raise InputError(f"cannot write {shown}: it is a folder; name a file in it.")
    if not stat.S_ISREG(target.stat().st_mode):
        raise InputError(
            f"cannot write {shown}: it is a device or a pipe; name a file."
        )
    if not os.access(target, os.W_OK):
        raise InputError(
            f"cannot write {shown}: the file is write-protected; lift that, or name "
            "another file."
        )


def _remedy(error: OSError) -> str:
    """What to do about an error of the operating system."""
    if isinstance(error, PermissionError):
        return "name a folder that you may write to"
    return "see to the disk, or name another folder"
