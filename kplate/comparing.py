"""Two records of `kplate check` side by side: what changed, and by how much.

Items of lists are matched by what they are called, not by where they stand: cases,
sides, zones, judgements. A number that changed by less than both its bands together
allow is marked: such a change may be the mesh's.
"""

import json
import math
from collections.abc import Iterator, Mapping, Sequence
from dataclasses import dataclass
from pathlib import Path
from typing import Any

from kplate.errors import InputError
from kplate.output.tables import columns
from kplate.units import DisplayUnits, Unit

# Changes smaller than this share are round-off.
SLIGHT = 1e-9
MOST_BYTES = 500_000_000  # of a record
# By what items of a list are called, the first that they have.
NAMES = ("name", "case", "mark", "side", "sides", "quantity")
# What of a statement says how it was drawn, not what it is.
PASSED_OVER = ("notes",)
ORDER = ("fails", "not proven", "passes")
THEORY = ("does not hold", "holds, conservative", "holds")
ABSENT = "-"


@dataclass(frozen=True, kw_only=True)
class Change:
    """Something that is not the same in two records.

    Parameters
    ----------
    what : str
        Where it stands, in words.
    old, new : object
        What it was and is, SI units; ``None`` where it is absent or has no value.
    unit : str
        SI unit; empty where it has none.
    within_bands : bool
        Whether the bands of both hold the change.
    """

    what: str
    old: Any
    new: Any
    unit: str = ""
    within_bands: bool = False

    @property
    def share(self) -> float | None:
        """The change of a number as a share of its old value."""
        if not (_is_number(self.old) and _is_number(self.new)) or self.old == 0.0:
            return None
        return float(self.new / self.old - 1.0)


@dataclass(frozen=True, kw_only=True)
class Comparison:
    """What changed between two records.

    Parameters
    ----------
    names : tuple of str
        Names of the panels, with the digests of their inputs.
    stated, found, judged : tuple of Change
        What was stated, what was found, and utilisations and outcomes.
    verdicts : tuple of str
        The words of both verdicts.
    worse : bool
        Whether the verdict, the outcome of a limit or the state of the theory is worse.
    """

    names: tuple[str, str]
    stated: tuple[Change, ...]
    found: tuple[Change, ...]
    judged: tuple[Change, ...]
    verdicts: tuple[str, str]
    worse: bool

    @property
    def status(self) -> int:
        """Exit status: 0 where nothing is judged worse, else 1."""
        return int(self.worse)

    @property
    def text(self) -> str:
        """What the command prints."""
        parts = [f"old: {self.names[0]}\nnew: {self.names[1]}"]
        for title, changes in (
            ("stated", self.stated),
            ("found", self.found),
            ("used", self.judged),
        ):
            if changes:
                parts.append(columns((title, "old", "new", "change"), _rows(changes)))
            else:
                parts.append(f"{title}: nothing changed")
        old, new = self.verdicts
        verdict = f"verdict, old and new: {new}"
        if old != new:
            verdict = f"verdict: {old} -> {new}"
        ending = " (worse)" if self.worse else ""
        return "\n\n".join([*parts, f"{verdict}{ending}"])


def compare(old: Path, new: Path) -> Comparison:
    """Compare two records that `kplate check` wrote.

    Parameters
    ----------
    old, new : Path
        The records (.json).

    Returns
    -------
    Comparison

    Raises
    ------
    InputError
        If a file cannot be read or is no such record.
    """
    records = [_record(Path(path)) for path in (old, new)]
    first, second = records
    stated = [
        change
        for part in ("panel", "statement")
        for change in _changes(first[part], second[part], "")
        if change.what != "input"
    ]
    limits = [_limits(record) for record in records]
    stated += _pairs(limits[0], limits[1], "limit on ")
    judged = [_judgements(record) for record in records]
    uses = [{k: j["used"] for k, j in own.items()} for own in judged]
    outcomes = [{k: j["outcome"] for k, j in own.items()} for own in judged]
    used = _pairs(uses[0], uses[1], "")
    used += _pairs(outcomes[0], outcomes[1], "outcome of ")
    theories = [record["verdict"].get("theory") for record in records]
    if theories[0] != theories[1]:
        used.append(Change(what="theory", old=theories[0], new=theories[1]))
    words = [str(record["verdict"]["words"]) for record in records]
    worse = _is_worse(ORDER, *(_outcome(w) for w in words))
    worse |= _is_worse(THEORY, *theories)
    worse |= any(
        _is_worse(ORDER, outcomes[0].get(key, "passes"), outcome)
        for key, outcome in outcomes[1].items()
    )
    return Comparison(
        names=(_name(first), _name(second)),
        stated=tuple(stated),
        found=tuple(_found(first, second)),
        judged=tuple(used),
        verdicts=(words[0], words[1]),
        worse=worse,
    )


def _record(path: Path) -> dict[str, Any]:
    """Read a record, and check that it is one."""
    shown = repr(str(path))
    try:
        if path.is_dir():
            raise InputError(f"{shown} is a folder; name a record (.json).")
        if path.stat().st_size > MOST_BYTES:
            raise InputError(f"{shown} is too long; name a record (.json).")
        record = json.loads(path.read_text("utf-8"))
    except OSError as error:
        raise InputError(f"cannot read {shown}: {error.strerror}.") from error
    except (ValueError, RecursionError) as error:
        why = "it nests too deeply" if isinstance(error, RecursionError) else error
        raise InputError(
            f"{shown} is no record: {' '.join(str(why).split())}; name a .json file "
            "that kplate check wrote."
        ) from error
    missing = _missing(record)
    if missing:
        raise InputError(
            f"{shown} is no record of kplate check: {missing}; name a .json file that "
            "it wrote."
        )
    return dict(record)


def _missing(record: Any) -> str:
    """What a record lacks or has in another form; empty where it is one."""
    if not isinstance(record, dict):
        return "it holds no table"
    for key, kind in (
        ("panel", dict),
        ("statement", dict),
        ("results", list),
        ("verdict", dict),
    ):
        if not isinstance(record.get(key), kind):
            return f"{key!r} is missing or of another form"
    verdict = record["verdict"]
    if not isinstance(verdict.get("words"), str):
        return "'verdict' has no words"
    judgements = verdict.get("judgements")
    if not isinstance(judgements, list):
        return "'verdict' has no judgements"
    keys = ("case", "quantity", "limit", "used", "outcome")
    for own in judgements:
        if not isinstance(own, dict) or not all(key in own for key in keys):
            return "a judgement is of another form"
    for own in record["results"]:
        sound = isinstance(own, dict) and isinstance(own.get("peaks"), dict)
        if not sound or not isinstance(own.get("reactions"), dict):
            return "the results of a case are of another form"
    return ""


def _name(record: Mapping[str, Any]) -> str:
    panel = record["panel"]
    revision = f", revision {panel['revision']}" if panel.get("revision") else ""
    return (
        f"{panel.get('name')}{revision}   input {panel.get('input')}, kplate "
        f"{record.get('kplate')}"
    )


def _outcome(words: str) -> str:
    """Which of the outcomes a verdict's words are."""
    return next((own for own in ORDER if words.startswith(own)), "passes")


def _is_worse(order: Sequence[str], old: Any, new: Any) -> bool:
    if old not in order or new not in order:
        return False
    return order.index(new) < order.index(old)


def _limits(record: Mapping[str, Any]) -> dict[str, Any]:
    """Limit of each quantity, with its unit."""
    return {
        f"{own['quantity']} [{own.get('unit', '')}]".removesuffix(" []"): own["limit"]
        for own in record["verdict"]["judgements"]
    }


def _judgements(record: Mapping[str, Any]) -> dict[str, Mapping[str, Any]]:
    """Judgements by case and quantity; the worst where several are alike."""
    found: dict[str, Mapping[str, Any]] = {}
    for own in record["verdict"]["judgements"]:
        key = f"{own['case']}, {own['quantity']}"
        if key not in found or _use(own) > _use(found[key]):
            found[key] = own
    return found


def _use(judgement: Mapping[str, Any]) -> float:
    used = judgement["used"]
    return float(used) if _is_number(used) else math.inf


def _pairs(old: Mapping[str, Any], new: Mapping[str, Any], prefix: str) -> list[Change]:
    """What differs between two mappings of plain values."""
    found = []
    for key in dict.fromkeys([*old, *new]):
        a, b = old.get(key), new.get(key)
        if _differ(a, b):
            what, unit = _parted(f"{prefix}{key}")
            found.append(Change(what=what, old=a, new=b, unit=unit))
    return found


def _found(old: Mapping[str, Any], new: Mapping[str, Any]) -> Iterator[Change]:
    """Changes of the numbers found, case by case."""
    first, second = (_numbers_found(record) for record in (old, new))
    for key in dict.fromkeys([*first, *second]):
        a, b = first.get(key, {}), second.get(key, {})
        if _differ(a.get("value"), b.get("value")):
            what, unit = _parted(key)
            yield Change(
                what=what,
                old=a.get("value"),
                new=b.get("value"),
                unit=unit,
                within_bands=_overlap(a, b),
            )


def _numbers_found(record: Mapping[str, Any]) -> dict[str, dict[str, Any]]:
    """Peaks and support forces of all cases, each with its band."""
    found: dict[str, dict[str, Any]] = {}
    for own in record["results"]:
        case, reactions = own.get("case"), own["reactions"]
        for key, value in own["peaks"].items():
            if isinstance(value, dict):
                found[f"{case}, peak {key}"] = value
        for kind, word in (("sides", "side"), ("points", "mark")):
            for part in _tables(reactions.get(kind)):
                force = {"value": part.get("force [N]")}
                found[f"{case}, force of {part.get(word)} [N]"] = force
        for part in _tables(reactions.get("corners")):
            sides = part.get("sides")
            name = "/".join(map(str, sides)) if isinstance(sides, list) else sides
            if isinstance(part.get("force [N]"), dict):
                found[f"{case}, corner {name} [N]"] = part["force [N]"]
    return found


def _tables(items: Any) -> list[dict[str, Any]]:
    if not isinstance(items, list):
        return []
    return [own for own in items if isinstance(own, dict)]


def _overlap(a: Mapping[str, Any], b: Mapping[str, Any]) -> bool:
    """Whether two bands have something in common."""
    ends = [own.get(end) for own in (a, b) for end in ("lower", "upper")]
    numbers = [float(end) for end in ends if end is not None and _is_number(end)]
    if len(numbers) < len(ends):
        return False
    return max(numbers[0], numbers[2]) <= min(numbers[1], numbers[3])


def _changes(old: Any, new: Any, where: str) -> Iterator[Change]:
    """What differs between two statements, down to plain values."""
    if isinstance(old, dict) and isinstance(new, dict):
        for key in dict.fromkeys([*old, *new]):
            if key not in PASSED_OVER:
                own = f"{where} {key}".strip()
                yield from _changes(old.get(key), new.get(key), own)
    elif _named(old) and _named(new):
        first, second = _by_name(old), _by_name(new)
        for key in dict.fromkeys([*first, *second]):
            yield from _changes(first.get(key), second.get(key), f"{where} {key}")
    elif _differ(old, new):
        what, unit = _parted(where)
        yield Change(what=what, old=old, new=new, unit=unit)


def _named(items: Any) -> bool:
    """Whether something is a list of tables."""
    return isinstance(items, list) and all(isinstance(own, dict) for own in items)


def _by_name(items: list[dict[str, Any]]) -> dict[str, Any]:
    """Items by what they are called, numbered where they share a name or have none."""
    found: dict[str, Any] = {}
    for own in items:
        called = next((own[key] for key in NAMES if key in own), own.get("kind", ""))
        name = key = str(called)
        count = 1
        while key in found:
            count += 1
            key = f"{name} {count}"
        found[key] = own
    return found


def _differ(old: Any, new: Any) -> bool:
    if _is_number(old) and _is_number(new):
        return bool(abs(new - old) > SLIGHT * max(abs(old), abs(new)))
    if isinstance(old, list) and isinstance(new, list) and len(old) == len(new):
        return any(_differ(a, b) for a, b in zip(old, new, strict=True))
    return bool(old != new)


def _is_number(value: Any) -> bool:
    return isinstance(value, int | float) and not isinstance(value, bool)


def _parted(key: str) -> tuple[str, str]:
    """A key and the unit in its brackets."""
    head, bracket, unit = key.removesuffix("]").rpartition(" [")
    return (head, unit) if bracket and key.endswith("]") else (key, "")


def _rows(changes: Sequence[Change]) -> list[tuple[str, str, str, str]]:
    return [
        (
            own.what,
            _shown(own.old, own.unit),
            _shown(own.new, own.unit),
            _change_words(own),
        )
        for own in changes
    ]


def _shown(value: Any, unit: str) -> str:
    """A plain value in the unit it is displayed in."""
    if value is None:
        return ABSENT
    if _is_number(value):
        own = _display(unit)
        if not unit:
            return f"{value:.4g}"
        return own.show(float(value))
    if isinstance(value, dict | list):
        if value and isinstance(value, list) and all(map(_is_number, value)):
            own = _display(unit)
            return f"({', '.join(f'{v / own.size:.4g}' for v in value)}) {own.symbol}"
        return "another" if value else "none"
    text = " ".join(str(value).split())
    return text if len(text) <= 60 else f"{text[:57]}..."


def _display(unit: str) -> Unit:
    units = DisplayUnits()
    known = {"m": units.deflection, "Pa": units.stress, "N/m": units.line_force}
    return known.get(unit, Unit(unit, 1.0))


def _change_words(change: Change) -> str:
    if change.old is None:
        return "added"
    if change.new is None:
        return "gone"
    share = change.share
    words = "" if share is None else f"{100.0 * share:+.3g} %"
    return f"{words}, within the bands" if change.within_bands else words
