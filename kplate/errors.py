"""What kplate raises and warns of.

Every message names the thing that is wrong, its value, what is allowed, and what to do
next, in the words and units of whoever stated it.
"""


class KplateError(Exception):
    """Anything kplate refuses or cannot do."""


class InputError(KplateError, ValueError):
    """A statement that cannot be right: an outline, a material, a load, a file."""


class MeshError(KplateError):
    """A mesh that could not be made or does not fit its outline."""


class SolveError(KplateError):
    """Equations that have no (trustworthy) solution, such as a plate free to move."""


class KplateWarning(UserWarning):
    """A result that stands but needs care."""
