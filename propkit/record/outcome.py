"""The outcome of a verification: a table of what was compared, as text, HTML, JSON and JUnit XML."""

from __future__ import annotations

import html
from collections.abc import Iterable
from dataclasses import dataclass, field
from typing import Any, Literal, Protocol
from xml.sax.saxutils import escape, quoteattr

from propkit.record.differences import Leaf

CheckStatus = Literal["same", "noted", "differs"]

_WORDS = {"same": "agrees", "noted": "noted", "differs": "DIFFERS"}
_MOST_SHOWN = 25
WIDE_SPACES = "\u00a0\u2003\u2007\u2008\u2009\u202f"
_ILLEGAL_XML = dict.fromkeys((*range(9), 11, 12, *range(14, 32), 0xFFFE, 0xFFFF), "\ufffd")


@dataclass(frozen=True, slots=True)
class Check:
    """One line of a verification: what was looked at, how it came out, and the detail."""

    name: str
    status: CheckStatus
    detail: str


@dataclass(frozen=True, slots=True)
class Verification:
    """What was compared in one record, and how it came out.

    Parameters
    ----------
    name : str
        Where the record is.
    digest : str
        Its digest as stored.
    title : str
        Its title.
    checks : tuple of Check
        The table.
    leaves : tuple of Leaf
        Every value that was recomputed and compared.
    """

    name: str
    digest: str
    title: str
    checks: tuple[Check, ...]
    leaves: tuple[Leaf, ...] = field(repr=False)

    @property
    def ok(self) -> bool:
        """Whether nothing differs."""
        return all(check.status != "differs" for check in self.checks)

    @property
    def status(self) -> str:
        """``verified``, ``verified with notes`` or ``mismatch``."""
        if not self.ok:
            return "mismatch"
        return "verified with notes" if any(_weighs(check) for check in self.checks) else "verified"

    @property
    def exit_code(self) -> int:
        """0 where nothing differs, else 1."""
        return 0 if self.ok else 1

    @property
    def differences(self) -> tuple[Leaf, ...]:
        """The values that differ, the largest difference first."""
        wrong = [leaf for leaf in self.leaves if not leaf.same]
        return tuple(sorted(wrong, key=lambda leaf: -(leaf.difference if leaf.difference is not None else float("inf"))))

    def with_checks(self, extra: Iterable[Check]) -> Verification:
        """Return the same with further checks."""
        return Verification(self.name, self.digest, self.title, (*self.checks, *extra), self.leaves)

    def __str__(self) -> str:
        width = max(len(check.name) for check in self.checks)
        lines = [f"{self.name}: {self.title}", f"  {self.status}: {self._count()} values recomputed and compared"]
        lines += [f"  {check.name:<{width}}  {_WORDS[check.status]:<8}  {check.detail}" for check in self.checks]
        lines += [f"    {line}" for line in self._difference_lines()]
        return "\n".join(visible(line) for line in lines)

    def _count(self) -> int:
        return len(self.leaves)

    def _difference_lines(self) -> list[str]:
        shown = [difference_line(leaf) for leaf in self.differences[:_MOST_SHOWN]]
        rest = len(self.differences) - len(shown)
        return [*shown, f"and {rest} more"] if rest > 0 else shown

    def to_html(self) -> str:
        """Return the table as a fragment of HTML without scripts; everything is escaped."""
        rows = "".join(
            f"<tr><td>{html.escape(check.name)}</td><td>{'<b>differs</b>' if check.status == 'differs' else _WORDS[check.status]}</td>"
            f'<td style="text-align:left">{html.escape(check.detail)}</td></tr>'
            for check in self.checks
        )
        wrong = "".join(f"<li>{html.escape(line)}</li>" for line in self._difference_lines())
        return (
            f'<div class="propkit-verification"><p><b>{html.escape(self.title)}</b>: {self.status}. '
            f"{self._count()} values were recomputed from the inputs and compared.</p>"
            f"<table><thead><tr><th>compared</th><th>outcome</th><th>detail</th></tr></thead><tbody>{rows}</tbody></table>"
            f"{f'<ul>{wrong}</ul>' if wrong else ''}</div>"
        )

    def _repr_html_(self) -> str:
        return self.to_html()

    def to_dict(self) -> dict[str, Any]:
        """Return the outcome as plain values, for JSON."""
        return {
            "name": self.name,
            "title": self.title,
            "digest": self.digest,
            "status": self.status,
            "values_compared": self._count(),
            "checks": [{"name": check.name, "status": check.status, "detail": check.detail} for check in self.checks],
            "differences": [
                {"path": leaf.path, "recorded": leaf.recorded, "recomputed": leaf.other, "difference": leaf.difference}
                for leaf in self.differences
            ],
        }

    def to_junit(self) -> str:
        """Return a JUnit ``testsuite`` element: one test case for each check."""
        cases = "".join(self._junit_case(check) for check in self.checks)
        failed = sum(check.status == "differs" for check in self.checks)
        return (
            f'<testsuite name={_attribute(f"{self.name}: {self.title}")} tests="{len(self.checks)}" failures="{failed}">{cases}</testsuite>'
        )

    def _junit_case(self, check: Check) -> str:
        name = f"<testcase classname={_attribute(self.name)} name={_attribute(check.name)}"
        if check.status == "differs":
            wrong = "\n".join([check.detail, *self._difference_lines()])
            return f"{name}><failure message={_attribute(check.detail)}>{escape(wrong.translate(_ILLEGAL_XML))}</failure></testcase>"
        return f"{name}><system-out>{escape(check.detail.translate(_ILLEGAL_XML))}</system-out></testcase>"


def visible(text: str) -> str:
    """Return a line from a stranger as a terminal may show it: control characters are written as escapes."""
    return "".join(letter if letter.isprintable() or letter in WIDE_SPACES else ascii(letter)[1:-1] for letter in text)


def _weighs(check: Check) -> bool:
    return check.status == "noted" and check.name != "free text"


def _attribute(text: str) -> str:
    return quoteattr(text.translate(_ILLEGAL_XML))


def difference_line(leaf: Leaf, names: tuple[str, str] = ("record", "recomputed")) -> str:
    """Return one difference in a line."""
    size = "" if leaf.difference is None else f" ({leaf.difference:.2e})"
    return f"{leaf.path}: {names[0]} {_short(leaf.recorded)}, {names[1]} {_short(leaf.other)}{size}"


def _short(value: Any) -> str:
    text = repr(value) if isinstance(value, int | float | bool) else f"{value}"
    text = " ".join(text.split())
    return text if len(text) <= 60 else f"{text[:57]}..."


class _Suites(Protocol):
    def to_junit(self) -> str: ...


def junit_document(results: Iterable[_Suites]) -> str:
    """Return a whole JUnit XML file of verifications."""
    suites = "".join(result.to_junit() for result in results)
    return f'<?xml version="1.0" encoding="UTF-8"?>\n<testsuites name="propkit verify">{suites}</testsuites>\n'
