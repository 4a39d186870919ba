"""The ``propkit`` command: memo, verify, compare, propellants, notebooks."""

from __future__ import annotations

import argparse
import json
import os
import sys
from collections.abc import Callable, Sequence
from pathlib import Path
from typing import Any

from propkit import __version__
from propkit.errors import MissingExtraError, PropkitError

GOOD, MISMATCH, UNUSABLE = 0, 1, 2


def main(arguments: Sequence[str] | None = None) -> int:
    """Run the command and return its exit code.

    Parameters
    ----------
    arguments : sequence of str, optional
        Command line without the name of the program; that of the process unless given.

    Returns
    -------
    int
        0 good; 1 a mismatch, or a notebook that raised; 2 unusable input.
    """
    options = _parser().parse_args(arguments)
    command: Callable[[argparse.Namespace], int] = options.command
    try:
        return command(options)
    except PropkitError as error:
        _complain(str(error))
        return UNUSABLE
    except KeyboardInterrupt:
        _complain("stopped")
        return 130
    except BrokenPipeError:
        os.dup2(os.open(os.devnull, os.O_WRONLY), sys.stdout.fileno())
        return GOOD


def _complain(text: str) -> None:
    from propkit.record.outcome import visible

    print("\n".join(visible(line) for line in f"propkit: {text}".split("\n")), file=sys.stderr)


def _parser() -> argparse.ArgumentParser:
    parser = argparse.ArgumentParser(prog="propkit", description="Thrust-chamber calculations: memos, records and propellants.")
    parser.add_argument("--version", action="version", version=f"propkit {__version__}")
    commands = parser.add_subparsers(title="commands", required=True, metavar="COMMAND")

    memo = commands.add_parser(
        "memo",
        help="execute a notebook and write memo and records",
        description="Execute a notebook in this Python and write the executed notebook, a self-contained HTML memo, a PDF memo and its records. "
        "This RUNS the code of the notebook: use it on notebooks that you trust.",
    )
    memo.add_argument("notebook", type=Path, metavar="NOTEBOOK")
    memo.add_argument("--out", type=Path, metavar="DIR", help="folder to write to (default: beside the notebook)")
    memo.add_argument("--as-is", action="store_true", help="take an already executed notebook; execute nothing")
    memo.add_argument("--crate", action="store_true", help="write each record as an RO-Crate (.zip) too, with the notebook inside")
    memo.add_argument("--paper", choices=("a4", "letter"), default="a4", help="size of the sheets of the PDF (default %(default)s)")
    memo.add_argument("--timeout", type=int, default=600, metavar="S", help="seconds that one cell may take (default %(default)s)")
    memo.set_defaults(command=_memo)

    verify = commands.add_parser(
        "verify",
        help="recompute every record in files and compare",
        description="Recompute every record in .json, .ipynb, .html and .zip files and compare it value by value. Nothing in the files is executed unless --rerun is given. "
        "Exit code: 0 all verified, 1 a mismatch, 2 unusable input or no record (the highest of several files).",
    )
    verify.add_argument("files", type=Path, nargs="+", metavar="FILE")
    verify.add_argument("--json", action="store_true", help="print the outcome as JSON")
    verify.add_argument("--junit", type=Path, metavar="XML", help="write the outcome as JUnit XML too")
    verify.add_argument(
        "--rerun",
        action="store_true",
        help="EXECUTE each notebook in a clean kernel and compare the records it makes with those it carries",
    )
    verify.set_defaults(command=_verify)

    compare = commands.add_parser(
        "compare", help="show what differs between two records", description="Show what differs between two records. Nothing is executed."
    )
    compare.add_argument("first", type=Path, metavar="A")
    compare.add_argument("second", type=Path, metavar="B")
    compare.add_argument("--html", type=Path, metavar="FILE", help="write the comparison as a page too")
    compare.set_defaults(command=_compare)

    propellants = commands.add_parser(
        "propellants",
        help="list the propellants, or show one",
        description="List the propellants of the library, or show one with its source and hazards.",
    )
    propellants.add_argument("name", nargs="?", metavar="NAME")
    propellants.set_defaults(command=_propellants)

    notebooks = commands.add_parser(
        "notebooks",
        help="copy the notebooks that come with propkit",
        description="Copy the notebooks that come with propkit into a folder.",
    )
    notebooks.add_argument("folder", type=Path, metavar="DIR")
    notebooks.add_argument("--open", action="store_true", help="open JupyterLab there (extra notebook)")
    notebooks.set_defaults(command=_notebooks)
    return parser


def _memo(options: argparse.Namespace) -> int:
    from propkit.memo.notebook import write_memo

    outcome = write_memo(
        options.notebook,
        options.out,
        execute=not options.as_is,
        timeout=options.timeout,
        crate=options.crate,
        paper=options.paper,
        say=_say,
    )
    for path in outcome.written:
        print(f"wrote {path}")
    if outcome.error:
        _complain(f"{outcome.error}\nThe partial notebook was kept.")
        return MISMATCH
    return GOOD


def _say(text: str) -> None:
    from propkit.record.outcome import visible

    print(visible(text), flush=True)


def _verify(options: argparse.Namespace) -> int:
    from propkit.record.files import verify_file
    from propkit.record.outcome import junit_document
    from propkit.record.storage import write_atomically

    known: dict[str, dict[str, Any]] = {}
    results = [verify_file(file, known) for file in options.files]
    if options.rerun:
        from propkit.memo.rerun import rerun

        results = [rerun(result, say=_tell) for result in results]
    if options.json:
        print(json.dumps([result.to_dict() for result in results], indent=1, ensure_ascii=False))
    else:
        print("\n\n".join(str(result) for result in results))
    if options.junit is not None:
        write_atomically(options.junit, junit_document(results).encode())
    return max(result.exit_code for result in results)


def _tell(text: str) -> None:
    from propkit.record.outcome import visible

    print(visible(text), file=sys.stderr)


def _compare(options: argparse.Namespace) -> int:
    from propkit.record import Record
    from propkit.record.storage import write_atomically

    comparison = Record.load(options.first).compare(Record.load(options.second))
    print(comparison)
    if options.html is not None:
        write_atomically(options.html, comparison.to_page().encode())
    return GOOD if comparison.same else MISMATCH


def _propellants(options: argparse.Namespace) -> int:
    if options.name is not None:
        from propkit.model.propellant import as_propellant

        print(as_propellant("name", options.name))
        return GOOD
    from propkit.data.propellants import library

    rows = [(row.name, row.title, ", ".join(row.roles), row.hazard) for row in library().values()]
    widths = [max(len(row[column]) for row in rows) for column in range(3)]
    for name, title, roles, hazard in sorted(rows, key=lambda row: row[0].casefold()):
        print(f"{name:<{widths[0]}}  {title:<{widths[1]}}  {roles:<{widths[2]}}  {hazard}")
    print(f"\n{len(rows)} propellants. One with its source, storage limits and hazards: propkit propellants NAME")
    return GOOD


def _notebooks(options: argparse.Namespace) -> int:
    from propkit.record.storage import make_folder, write_atomically

    folder = make_folder(options.folder)
    kept = []
    for name, data in _packaged_notebooks():
        target = folder / name
        if target.exists() and target.read_bytes() != data:
            kept.append(target)
            continue
        write_atomically(target, data)
        print(f"wrote {target}")
    for target in kept:
        print(f"kept {target}: it is there already and differs")
    if options.open:
        _open_lab(folder)
    return GOOD


def _packaged_notebooks() -> list[tuple[str, bytes]]:
    """Return name and bytes of the notebooks: of the installed package, or of the source tree."""
    here = Path(__file__).resolve().parent
    for place in (here / "notebooks", here.parent / "notebooks"):
        if place.is_dir():
            found = [(path.name, path.read_bytes()) for path in sorted(place.glob("*.ipynb"))]
            if found:
                return found
    raise PropkitError("this installation of propkit carries no notebooks")


def _open_lab(folder: Path) -> None:
    import importlib.util
    import subprocess

    if importlib.util.find_spec("jupyterlab") is None:
        raise MissingExtraError("jupyterlab", "notebook", "opening the notebooks")
    subprocess.run([sys.executable, "-m", "jupyterlab", str(folder)], check=False)


if __name__ == "__main__":
    sys.exit(main())
