"""The errors of propkit: typed, carrying data, each with a builtin parent.

Every refusal says what was given, what is allowed and what to try next. The data stay on the
exception, so that a panel can put the words beside the control that caused them.
"""

from __future__ import annotations

from collections.abc import Iterable, Mapping
from dataclasses import dataclass
from typing import Any


@dataclass(frozen=True, slots=True)
class Problem:
    """One thing wrong with one input.

    Parameters
    ----------
    name : str
        Public name of the input, for instance ``pressure``.
    value : str
        What was given, as text.
    allowed : str
        What is allowed, as a clause that follows "it must be".
    hint : str
        What to try; may be empty.
    """

    name: str
    value: str
    allowed: str
    hint: str = ""

    def __str__(self) -> str:
        text = f"`{self.name}` is {self.value}; it must be {self.allowed}."
        return f"{text} {self.hint}" if self.hint else text


class PropkitError(Exception):
    """Parent of every error that propkit raises on purpose."""

    def __init__(self, message: str, **data: Any) -> None:
        super().__init__(message)
        self.message = message
        self.data: dict[str, Any] = data

    def __reduce__(self) -> tuple[Any, ...]:
        return _rebuild, (type(self), self.message, self.data)


def _rebuild(kind: type[PropkitError], message: str, data: dict[str, Any]) -> PropkitError:
    error = kind.__new__(kind)
    Exception.__init__(error, message)
    error.message = message
    error.data = data
    if isinstance(error, InputError):
        error.problems = tuple(data.get("problems", ()))
    return error


class InputError(PropkitError, ValueError):
    """One or more inputs are wrong or missing; all of them are listed in `problems`."""

    problems: tuple[Problem, ...]

    def __init__(self, problems: Problem | Iterable[Problem] | str, **data: Any) -> None:
        if isinstance(problems, str):
            listed: tuple[Problem, ...] = ()
            message = problems
        else:
            listed = (problems,) if isinstance(problems, Problem) else tuple(problems)
            message = "\n".join(str(problem) for problem in listed)
        super().__init__(message, problems=listed, **data)
        self.problems = listed


class RangeError(PropkitError, ValueError):
    """The question has no answer inside the range of the data; `data` carries the state reached."""


class ConvergenceError(PropkitError, RuntimeError):
    """An iteration did not converge; `data` carries iterations, residual and the last state."""


class NotAvailableError(PropkitError, AttributeError):
    """A result that this recipe does not have; the message says why and what has it."""


class RecordError(PropkitError, ValueError):
    """A record that cannot be read, or whose form is not that of a record."""


class StorageError(PropkitError, OSError):
    """A file that cannot be read or written."""


class MissingExtraError(PropkitError, ImportError):
    """An optional dependency is absent; the message names the line that installs it."""

    def __init__(self, package: str, extra: str, purpose: str) -> None:
        super().__init__(
            f"{purpose} needs {package}, which is not installed. Install it with: pip install 'propkit[{extra}]'",
            package=package,
            extra=extra,
            purpose=purpose,
        )


def near_matches(name: str, candidates: Iterable[str], count: int = 4) -> list[str]:
    """Return the candidates most like `name`, the nearest first."""
    import difflib

    folded: Mapping[str, str] = {candidate.casefold(): candidate for candidate in candidates}
    found = difflib.get_close_matches(name.casefold(), list(folded), n=count, cutoff=0.5)
    inside = [key for key in folded if name and name.casefold() in key and key not in found]
    return [folded[key] for key in [*found, *inside][:count]]
