"""The designs of a study: what varies, how, and in which blocks; nothing is computed here.

A mapping of lists is a grid, its last path varying fastest; a table is a list of cases. Numbers are kept in SI,
choices (words, propellants, names of bases) as options with codes. Every block holds designs of one choice only.
"""

from __future__ import annotations

import math
from collections.abc import Iterator, Mapping, Sequence
from dataclasses import dataclass
from typing import Any

import numpy as np
import numpy.typing as npt

from propkit import quantities
from propkit.errors import InputError, Problem, PropkitError
from propkit.model import paths
from propkit.model.base import Calculation
from propkit.model.declare import CustomInput, NumberInput, QuantityInput, as_text
from propkit.study.evaluation import is_enthalpy, variable

Array = npt.NDArray[np.float64]
Integers = npt.NDArray[np.intp]

BLOCK = 2500
"""Designs in one block."""
LISTED = 5
"""Bad values listed for one column."""
QUICK = "the quick engine solved"
"""How the note begins that says which engine solved a study."""


@dataclass(frozen=True, slots=True, eq=False)
class Column:
    """One path that varies: its values, and how a design picks one.

    Parameters
    ----------
    path : str
        Whole path.
    unit : str
        SI unit; empty for a choice or a pure number.
    values : array
        SI values, or the codes of a choice; one for each place of the axis, or one for each design.
    stride : int
        Designs between two places of a grid; 0 for a list of cases.
    options : tuple
        What the codes of a choice stand for; empty for a number.
    """

    path: str
    unit: str
    values: npt.NDArray[Any]
    stride: int = 0
    options: tuple[Any, ...] = ()

    @property
    def is_choice(self) -> bool:
        """Whether the path is a choice."""
        return bool(self.options)

    def at(self, rows: Integers) -> npt.NDArray[Any]:
        """Return values or codes of some designs."""
        return self.values[(rows // self.stride) % len(self.values)] if self.stride else self.values[rows]

    def shown(self, rows: Integers) -> npt.NDArray[Any]:
        """Return what a table shows of some designs: SI values, or the options."""
        found = self.at(rows)
        if not self.is_choice:
            return found
        texts = np.empty(len(self.options), dtype=object)
        texts[:] = [option_text(option) for option in self.options]
        return np.asarray(texts[found])


@dataclass(frozen=True, slots=True, eq=False)
class Plan:
    """All designs of a study.

    Parameters
    ----------
    columns : tuple of Column
        What varies.
    count : int
        Number of designs.
    shape : tuple of int
        Places on each axis of a grid; empty for a list of cases.
    """

    columns: tuple[Column, ...]
    count: int
    shape: tuple[int, ...] = ()

    @property
    def numbers(self) -> tuple[Column, ...]:
        """The columns that are numbers."""
        return tuple(column for column in self.columns if not column.is_choice)

    @property
    def choices(self) -> tuple[Column, ...]:
        """The columns that are choices."""
        return tuple(column for column in self.columns if column.is_choice)

    def groups(self) -> list[tuple[dict[str, Any], Integers]]:
        """Return the choices that occur, each with its designs in order."""
        rows = np.arange(self.count)
        if not self.choices:
            return [({}, rows)]
        key = np.zeros(self.count, dtype=np.intp)
        for column in self.choices:
            key = key * len(column.options) + column.at(rows)
        _, first, which = np.unique(key, return_index=True, return_inverse=True)
        found = []
        for number in np.argsort(first):
            place = first[number : number + 1]
            chosen = {column.path: column.options[int(column.at(place)[0])] for column in self.choices}
            found.append((chosen, np.flatnonzero(which.ravel() == number)))
        return found

    def inputs(self, rows: Integers) -> dict[str, Array]:
        """Return the numbers of some designs by path."""
        return {column.path: np.array(column.at(rows), dtype=np.float64) for column in self.numbers}

    def ranges(self, rows: Integers | None = None) -> dict[str, tuple[float, float]]:
        """Return lowest and highest value of each number, over some designs or all."""
        found = {}
        for column in self.numbers:
            values = column.values if column.stride or rows is None else column.at(rows)
            found[column.path] = (float(np.min(values)), float(np.max(values)))
        return found

    def design(self, row: int) -> dict[str, Any]:
        """Return the inputs of one design by path, as `replace` takes them."""
        place = np.array([row])
        return {
            column.path: column.options[int(column.at(place)[0])] if column.is_choice else float(column.at(place)[0])
            for column in self.columns
        }


def option_text(option: Any) -> Any:
    """Return a choice as a table shows it: words, numbers and flags as they are, an object by its label."""
    if option is None or isinstance(option, str | bool | int | float):
        return option
    return str(getattr(option, "label", None) or getattr(option, "text", None) or option)


def read_plan(target: Calculation, what: Any) -> Plan:
    """Return the designs that a mapping of lists (a grid) or a table (a list of cases) asks for.

    Parameters
    ----------
    target : Calculation
        The object whose inputs vary.
    what : mapping or DataFrame
        Paths and values.

    Returns
    -------
    Plan
        Every value read and legal.

    Raises
    ------
    InputError
        Listing every path that is unknown, ambiguous or named twice, every column that is empty or ragged, and every value
        that is not legal.
    """
    table = hasattr(what, "columns") and hasattr(what, "iloc")
    if not table and not isinstance(what, Mapping):
        raise InputError(Problem("designs", as_text(what), "a mapping of paths to lists (a grid) or a DataFrame (a list of cases)"))
    given = [(name, what[name]) for name in (what.columns if table else what)] if not _doubled(what, table) else []
    if not given:
        raise InputError(
            Problem("designs", "without a column", "paths with values", 'For example {"chamber.pressure": ["5 MPa", "9 MPa"]}.')
        )
    problems: list[Problem] = []
    read: dict[str, tuple[str, npt.NDArray[Any], tuple[Any, ...]]] = {}
    for path, values in given:
        try:
            whole, unit, found, options = _column(target, path, values)
            if whole in read:
                raise InputError(Problem(str(path), f"a second name of {whole}", "named once"))
            read[whole] = (unit, found, options)
        except InputError as error:
            problems.extend(error.problems or (Problem(str(path), "not understood", "a path of an input", str(error)),))
    if problems:
        raise InputError(problems)
    sizes = [len(values) for _, values, _ in read.values()]
    if table:
        columns = tuple(Column(path, unit, values, 0, options) for path, (unit, values, options) in read.items())
        return Plan(columns, sizes[0])
    strides = [math.prod(sizes[place + 1 :]) for place in range(len(sizes))]
    columns = tuple(
        Column(path, unit, values, stride, options) for (path, (unit, values, options)), stride in zip(read.items(), strides, strict=True)
    )
    return Plan(columns, math.prod(sizes), tuple(sizes))


def _doubled(what: Any, table: bool) -> bool:
    """Refuse a table with two columns of one name."""
    if table and what.columns.has_duplicates:
        names = sorted({str(name) for name in what.columns[what.columns.duplicated()]})
        raise InputError(Problem("designs", f"a table with the column {', '.join(names)} twice", "a table with each column once"))
    return False


def _column(target: Calculation, path: Any, values: Any) -> tuple[str, str, npt.NDArray[Any], tuple[Any, ...]]:
    """Return whole path, unit, values or codes, and options of one column."""
    if not isinstance(path, str):
        raise InputError(Problem(str(path), "no text", "a path such as 'chamber.pressure'"))
    listed = _listed(path, values)
    if is_enthalpy(path):
        known = variable(target, path)
        return known.path, known.unit, _numbers(known.path, listed, known.unit, None), ()
    place = paths.resolve(target, path, results=False)
    link = target.chain()[place.position]
    if place.name in (link.upstream_input, "name"):
        raise InputError(Problem(path, "the object upstream" if place.name != "name" else "a title", "an input that changes the numbers"))
    entry = link.declared_inputs[place.name]
    if isinstance(entry, QuantityInput | NumberInput) or place.name == "ambient":
        return place.path, entry.quantity.unit, _numbers(place.path, listed, entry.quantity.unit, entry), ()
    return place.path, "", *_choices(place.path, listed, entry)


def _listed(path: str, values: Any) -> Any:
    """Return the values of a column as an array or a list; a single value is refused."""
    if isinstance(values, str | bytes | Mapping) or not (hasattr(values, "__len__") or isinstance(values, range)):
        raise InputError(Problem(path, as_text(values), "a list of values", "Write [value] for a single one."))
    if hasattr(values, "magnitude") and hasattr(values, "units"):
        found: Any = [type(values)(float(value), values.units) for value in np.atleast_1d(values.magnitude)]
    elif isinstance(values, list | tuple | range):
        found = list(values)
    else:
        found = np.asarray(values)
        if found.ndim == 0:
            raise InputError(Problem(path, as_text(values), "a list of values"))
        if found.ndim != 1:
            raise InputError(Problem(path, f"an array of shape {found.shape}", "a list of values, one-dimensional"))
    if len(found) == 0:
        raise InputError(Problem(path, "an empty list", "at least one value"))
    if any(isinstance(value, list | tuple | np.ndarray) for value in (found if isinstance(found, list) else found[:1])):
        raise InputError(Problem(path, "a list of lists", "a list of single values", "Ragged or nested columns are no grid."))
    return found


def _numbers(path: str, listed: Any, unit: str, entry: Any) -> Array:
    """Return a column of numbers in SI, every one legal."""
    if isinstance(listed, np.ndarray) and listed.dtype.kind in "fiu":
        values = listed.astype(np.float64)
        texts: Any = values
    else:
        values, texts = _parsed(path, listed, unit, entry), listed
    bounds = getattr(entry, "bounds", None)
    infinite = np.isposinf(values) & bool(getattr(entry, "infinite", False))
    good = np.isfinite(values) | infinite
    allowed = "a finite number"
    if bounds is not None and good.all():
        good = infinite | _inside(bounds, values)
        allowed = bounds.text(unit)
    elif isinstance(entry, CustomInput) and good.all():
        good, allowed = values >= 0.0, "0 Pa or more"
    if not good.all():
        bad = np.flatnonzero(~good)
        more = f" and {len(bad) - LISTED} more" if len(bad) > LISTED else ""
        which = ", ".join(f"{as_text(_item(texts[place]))} at place {place}" for place in bad[:LISTED])
        raise InputError(Problem(path, f"{which}{more}", allowed, getattr(entry, "hint", "")))
    return values


def _inside(bounds: Any, values: Array) -> npt.NDArray[np.bool_]:
    good = np.ones(values.shape, dtype=bool)
    if bounds.at_least is not None:
        good &= values >= bounds.at_least
    if bounds.above is not None:
        good &= values > bounds.above
    if bounds.at_most is not None:
        good &= values <= bounds.at_most
    if bounds.below is not None:
        good &= values < bounds.below
    return good


def _item(value: Any) -> Any:
    return value.item() if isinstance(value, np.generic) else value


def _parsed(path: str, listed: Sequence[Any], unit: str, entry: Any) -> Array:
    """Return values read one by one; every bad one in one error."""
    from propkit import units

    problems: list[Problem] = []
    found = np.full(len(listed), np.nan)
    for place, value in enumerate(listed):
        plain = _item(value)
        try:
            read = units.to_si(plain, unit, path) if entry is None else entry.read(plain)
            found[place] = float(getattr(read, "pressure", read))
        except InputError as error:
            problems.extend(Problem(path, f"{problem.value} at place {place}", problem.allowed, problem.hint) for problem in error.problems)
            if not error.problems:
                problems.append(Problem(path, f"{as_text(plain)} at place {place}", "a legal value", str(error)))
        except (TypeError, ValueError):
            problems.append(Problem(path, f"{as_text(plain)} at place {place}", "a number or a text with a unit"))
    if problems:
        raise InputError(problems[:LISTED])
    return found


def _choices(path: str, listed: Any, entry: Any) -> tuple[Integers, tuple[Any, ...]]:
    """Return codes and options of a choice, the options in order of appearance, every one legal."""
    options: list[Any] = []
    keys: dict[str, int] = {}
    codes = np.empty(len(listed), dtype=np.intp)
    problems: list[Problem] = []
    for place, value in enumerate(listed):
        plain = _item(value)
        key = f"{type(plain).__name__} {plain!r}"
        if key not in keys:
            try:
                if plain is not None:
                    entry.read(plain)
            except PropkitError as error:
                problems.extend(getattr(error, "problems", ()) or (Problem(path, as_text(plain), "a legal choice", str(error)),))
            keys[key] = len(options)
            options.append(plain)
        codes[place] = keys[key]
    if problems:
        raise InputError([Problem(path, problem.value, problem.allowed, problem.hint) for problem in problems[:LISTED]])
    return codes, tuple(options)


def blocks_of(groups: Sequence[tuple[Any, Integers]]) -> list[tuple[int, int, int]]:
    """Return the blocks of all groups in order: group, and where in its designs the block begins and ends."""
    return [
        (number, first, min(first + BLOCK, len(rows))) for number, (_, rows) in enumerate(groups) for first in range(0, len(rows), BLOCK)
    ]


def unit_of(target: Calculation, name: str) -> str:
    """Return the SI unit of a result by its name in tables."""
    place = paths.resolve(target, name)
    return quantities.quantity(place.name.rpartition(".")[2], target.chain()[place.position].kind).unit


def units_of(target: Calculation, names: Sequence[str]) -> dict[str, str]:
    """Return the SI unit of each result by its name in tables."""
    known = paths.places(target)
    kinds = [link.kind for link in target.chain()]
    found = {}
    for name in names:
        place = known.get(f"{target.kind}.{name}") or known.get(name)
        found[name] = quantities.quantity(place.name.rpartition(".")[2], kinds[place.position]).unit if place else unit_of(target, name)
    return found


def templates(
    target: Calculation, plan: Plan, groups: Sequence[tuple[dict[str, Any], Integers]]
) -> Iterator[Calculation | InputError | None]:
    """Yield the object that each group of designs is a variation of; the error where none of a few designs is allowed, None else."""
    given = {f"{link.kind}.{name}" for link in target.chain() for name in link.inputs}
    numbers = {column.path for column in plan.numbers if not is_enthalpy(column.path)}
    for chosen, rows in groups:
        if not chosen and given.issuperset(numbers):
            yield target
            continue
        tried = dict.fromkeys(int(rows[place]) for place in (0, len(rows) // 2, len(rows) - 1, len(rows) // 3))
        refused: InputError | None = None
        found = None
        for row in tried:
            wanted = {path: value for path, value in plan.design(row).items() if not is_enthalpy(path)}
            try:
                found = target.replace(wanted)
                break
            except InputError as error:
                refused = error
            except PropkitError:
                refused = None
        yield found if found is not None else refused
