"""A coverage-guided fuzzer of the loaders: whatever a file holds, only PropkitError comes out.

Run by `test_fuzz.py`, or by hand for longer: ``python tests/record/fuzz_loaders.py -max_total_time=300``. The first byte says what the
others are: a file of one of the four kinds, or changes to the leaves of a stored record, which is then shown, compared and judged.
"""

from __future__ import annotations

import copy
import io
import sys
import zipfile
from pathlib import Path
from typing import Any

import atheris

from propkit.model.base import RECORD_MIME

with atheris.instrument_imports(include=["propkit.record"]):
    from propkit.errors import PropkitError
    from propkit.record.containers import record_template, records_of
    from propkit.record.record import Record
    from propkit.record.verify import judged, recomputed

SAMPLE = Record.load(next(iter(sorted((Path(__file__).parent / "samples").glob("record-v*.json"), reverse=True))))
AGAIN = recomputed(SAMPLE.content)
SUFFIXES = (".json", ".ipynb", ".html", ".zip")
_CHANGES = len(SUFFIXES)


def places(value: Any, path: tuple[Any, ...] = ()) -> list[tuple[Any, ...]]:
    """Return the path of every entry of a plain value, mappings and lists included."""
    entries = value.items() if isinstance(value, dict) else enumerate(value) if isinstance(value, list) else ()
    return [found for key, entry in entries for found in [(*path, key), *places(entry, (*path, key))]]


PLACES = places(SAMPLE.document)


def consumed(data: atheris.FuzzedDataProvider) -> Any:
    kind = data.ConsumeIntInRange(0, 9)
    if kind == 0:
        return data.ConsumeInt(8)
    if kind == 1:
        return data.ConsumeFloat()
    if kind == 2:
        return data.ConsumeUnicode(12)
    if kind == 3:
        return data.ConsumeUnicodeNoSurrogates(12)
    return (None, True, [], {}, "infinite", [[[]]])[kind - 4]


def changed_record(data: atheris.FuzzedDataProvider) -> None:
    document = copy.deepcopy(SAMPLE.document)
    for _ in range(data.ConsumeIntInRange(1, 4)):
        path, target = data.PickValueInList(PLACES), document
        try:
            for step in path[:-1]:
                target = target[step]
            if data.ConsumeBool():
                target[path[-1]] = consumed(data)
            else:
                del target[path[-1]]
        except (KeyError, IndexError, TypeError):
            continue
    record = Record(document)
    judged(record.document, AGAIN, "fuzz")
    str(record)
    record._repr_mimebundle_()
    str(record.compare(SAMPLE))
    SAMPLE.compare(record).to_html()


def one_input(text: bytes) -> None:
    """Feed one input to the loaders."""
    data = atheris.FuzzedDataProvider(text)
    kind = data.ConsumeIntInRange(0, _CHANGES)
    try:
        if kind == _CHANGES:
            changed_record(data)
        else:
            records_of(SUFFIXES[kind], data.ConsumeBytes(len(text)), "fuzz")
    except PropkitError:
        return


def write_corpus(folder: Path) -> None:
    """Write a valid file of each kind; the fuzzed-data provider takes its choice from the last byte."""
    document = SAMPLE.to_bytes().decode()
    stream = io.BytesIO()
    with zipfile.ZipFile(stream, "w", zipfile.ZIP_DEFLATED) as archive:
        archive.writestr("x.record.json", document)
    output = f'{{"output_type":"display_data","metadata":{{}},"data":{{"{RECORD_MIME}":{document}}}}}'
    notebook = f'{{"cells":[{{"cell_type":"code","source":"x","execution_count":1,"metadata":{{}},"outputs":[{output}]}}],"metadata":{{}},"nbformat":4,"nbformat_minor":5}}'
    for kind, data in enumerate(
        (document.encode(), notebook.encode(), f"<p>{record_template(SAMPLE)}</p>".encode(), stream.getvalue(), b"change" * 20)
    ):
        (folder / str(kind)).write_bytes(data + bytes([kind]))


if __name__ == "__main__":
    import tempfile

    with tempfile.TemporaryDirectory() as corpus:
        write_corpus(Path(corpus))
        atheris.Setup([sys.argv[0], corpus, "-max_len=60000", "-timeout=60", *sys.argv[1:]], one_input)
        atheris.Fuzz()
