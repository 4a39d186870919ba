"""Verification of whole files: every record that they carry, and what is to be said about the file."""

from __future__ import annotations

from dataclasses import dataclass
from pathlib import Path
from typing import Any

from propkit.errors import PropkitError
from propkit.record.containers import records_in
from propkit.record.outcome import Check, Verification, visible


@dataclass(frozen=True, slots=True)
class FileVerification:
    """What came out for one file: verifications of its records, checks of the file, or why it cannot be used."""

    path: str
    verifications: tuple[Verification, ...] = ()
    checks: tuple[Check, ...] = ()
    problem: str = ""

    @property
    def exit_code(self) -> int:
        """0 all verified, 1 a mismatch, 2 unusable or without a record."""
        if self.problem:
            return 2
        found = [verification.exit_code for verification in self.verifications]
        return max([*found, *(1 for check in self.checks if check.status == "differs")])

    @property
    def status(self) -> str:
        """``verified``, ``verified with notes``, ``mismatch`` or ``unusable``."""
        if self.problem:
            return "unusable"
        if self.exit_code:
            return "mismatch"
        noted = any(check.status == "noted" for check in self.checks)
        return "verified with notes" if noted or any(v.status != "verified" for v in self.verifications) else "verified"

    def __str__(self) -> str:
        if self.problem:
            return f"{visible(self.path)}: unusable\n  {visible(self.problem)}"
        count = len(self.verifications)
        lines = [f"{visible(self.path)}: {self.status} ({count} record{'s' if count != 1 else ''})"]
        lines += [f"  {check.name}: {visible(check.detail)}" for check in self.checks]
        return "\n\n".join(["\n".join(lines), *(str(verification) for verification in self.verifications)])

    def to_dict(self) -> dict[str, Any]:
        """Return the outcome as plain values."""
        return {
            "file": self.path,
            "status": self.status,
            "exit_code": self.exit_code,
            "problem": self.problem,
            "checks": [{"name": check.name, "status": check.status, "detail": check.detail} for check in self.checks],
            "records": [verification.to_dict() for verification in self.verifications],
        }

    def to_junit(self) -> str:
        """Return JUnit test suites: one for each record, and one for the file itself."""
        own = self.checks or ((Check("file", "differs", self.problem),) if self.problem else ())
        whole = Verification(self.path, "", "file", own, ()) if own else None
        return "".join(part.to_junit() for part in (*([whole] if whole else []), *self.verifications))


def verify_file(path: str | Path, known: dict[str, dict[str, Any]] | None = None) -> FileVerification:
    """Return the verification of every record in a file; nothing in it is executed.

    Parameters
    ----------
    path : str or Path
        A .json, .ipynb, .html or .zip file.
    known : dict, optional
        What was recomputed already in this run, by digest of the recipe; filled.

    Returns
    -------
    FileVerification
        The outcome; a file that cannot be used is an outcome too.
    """
    try:
        contents = records_in(path)
    except PropkitError as error:
        return FileVerification(str(path), problem=error.message)
    if not contents.found:
        return FileVerification(str(path), problem="the file carries no record")
    known = {} if known is None else known
    unique: dict[str, Verification] = {}
    made = []
    for entry in contents.found:
        digest = entry.record.digest
        if digest not in unique:
            unique[digest] = entry.record.verify(entry.place, known)
        first = unique[digest]
        made.append(Verification(entry.place, first.digest, first.title, (*first.checks, *entry.checks), first.leaves))
    return FileVerification(str(path), tuple(made), contents.checks)
