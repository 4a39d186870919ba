"""Files from strangers: archives, pages and notebooks that try to lead outside, to fill the memory, or to hide something."""

import base64
import io
import json
import stat
import zipfile

import pytest

from propkit.errors import RecordError
from propkit.model.base import RECORD_MIME
from propkit.record.containers import record_template, records_of


def archive(*members, compression=zipfile.ZIP_DEFLATED):
    stream = io.BytesIO()
    with zipfile.ZipFile(stream, "w", compression) as made:
        for name, data in members:
            made.writestr(name, data)
    return stream.getvalue()


@pytest.mark.parametrize(
    "name",
    [
        "../x.record.json",
        "/etc/x.record.json",
        "a/../../x.record.json",
        "C:/x.record.json",
        "a\\..\\x.record.json",
        "\\\\host\\x.record.json",
    ],
)
def test_paths_that_lead_outside(name):
    with pytest.raises(RecordError, match="outside"):
        records_of(".zip", archive((name, "{}")), "x.zip")


def test_links_and_doubles(record):
    link = zipfile.ZipInfo("x.record.json")
    link.external_attr = (stat.S_IFLNK | 0o777) << 16
    with pytest.raises(RecordError, match="link"):
        records_of(".zip", archive((link, "/etc/passwd")), "x.zip")
    with pytest.warns(UserWarning, match="Duplicate"):
        data = archive(("a.record.json", record.to_bytes()), ("a.record.json", record.to_bytes()))
    with pytest.raises(RecordError, match="twice"):
        records_of(".zip", data, "x.zip")
    with pytest.raises(RecordError, match="twice"):
        records_of(".zip", archive(("a.record.json", record.to_bytes()), ("A.record.json", record.to_bytes())), "x.zip")


def test_bombs(record):
    with pytest.raises(RecordError, match="times its size"):
        records_of(".zip", archive(("a.record.json", b" " * 60_000_000)), "x.zip")
    with pytest.raises(RecordError, match="members"):
        records_of(".zip", archive(*((f"{place}.txt", b"") for place in range(2100))), "x.zip")
    lying = bytearray(archive(("a.record.json", record.to_bytes() + b" " * 3_000_000)))
    place = lying.rfind(b"PK\x01\x02")
    lying[place + 24 : place + 28] = (100).to_bytes(4, "little")
    with pytest.raises(RecordError):
        records_of(".zip", bytes(lying), "x.zip")


@pytest.mark.parametrize("data", [b"", b"PK", b"PK\x05\x06" + b"\0" * 18, b"not a zip"])
def test_what_is_no_archive(data):
    try:
        assert not records_of(".zip", data, "x.zip").found
    except RecordError:
        pass


def test_truncated_archive(record):
    data = archive(("a.record.json", record.to_bytes()))
    for length in range(0, len(data), 500):
        with pytest.raises(RecordError):
            records_of(".zip", data[:length], "x.zip")


def test_page(record):
    page = f"<!doctype html><p>x</p>{record_template(record)}".encode()
    assert records_of(".html", page, "x.html").found[0].record == record
    assert not records_of(".html", b"<p>nothing</p>", "x.html").found
    for inside in ("<b>", "e30", "====", base64.b64encode(b"[NaN]").decode(), "ä"):
        with pytest.raises(RecordError):
            records_of(".html", f"<template data-propkit-record>{inside}</template>".encode(), "x.html")
    with pytest.raises(RecordError):
        records_of(".html", b"<template data-propkit-record>e30=", "x.html")


def notebook(*documents, source="perf"):
    outputs = [{"output_type": "display_data", "metadata": {}, "data": {RECORD_MIME: document}} for document in documents]
    cell = {"cell_type": "code", "source": source, "execution_count": 1, "outputs": outputs, "metadata": {}}
    return json.dumps({"cells": [cell], "metadata": {}, "nbformat": 4, "nbformat_minor": 5}).encode()


def test_notebook(record):
    contents = records_of(".ipynb", notebook(record.document, record.document), "x.ipynb")
    assert [entry.record == record for entry in contents.found] == [True, True]
    assert contents.checks[0].status == "same"
    with pytest.raises(RecordError, match="cell 1"):
        records_of(".ipynb", notebook({"schema": "propkit-record/1"}), "x.ipynb")
    with pytest.raises(RecordError, match="more than 500"):
        records_of(".ipynb", notebook(*[record.document] * 501), "x.ipynb")


@pytest.mark.parametrize("value", [[], {}, {"cells": {}}, {"cells": [3]}, {"worksheets": []}])
def test_what_is_no_notebook(value):
    with pytest.raises(RecordError):
        records_of(".ipynb", json.dumps(value).encode(), "x.ipynb")


@pytest.mark.parametrize("outputs", [3, [3], [{"data": 3}], [{"data": {RECORD_MIME: 3}}], [{"output_type": "x"}]])
def test_odd_outputs(outputs):
    cell = {"cell_type": "code", "source": ["a", 3], "outputs": outputs}
    try:
        assert not records_of(".ipynb", json.dumps({"cells": [cell]}).encode(), "x.ipynb").found
    except RecordError:
        pass


def test_odd_archives(record):
    inner = archive(("a.record.json", record.to_bytes()))
    assert not records_of(".zip", archive(("inner.zip", inner)), "x.zip").found
    assert not records_of(".zip", archive(("a.record.json/", b"")), "x.zip").found
    for data in (archive(("a.record.json", b"")), inner + b"x" * 70_000):
        with pytest.raises(RecordError):
            records_of(".zip", data, "x.zip")
    for change, value in ((42, b"\xf0\xff\xff\x0f"), (10, b"a\0"), (20, b"\x0a\0\0\0")):  # offset, method, packed size
        lying = bytearray(inner)
        place = lying.find(b"PK\x01\x02") + change
        lying[place : place + len(value)] = value
        with pytest.raises(RecordError):
            records_of(".zip", bytes(lying), "x.zip")
    for method in (zipfile.ZIP_BZIP2, zipfile.ZIP_LZMA):
        assert len(records_of(".zip", archive(("å/日本.record.json", record.to_bytes()), compression=method), "x.zip").found) == 1


def test_names_in_an_archive_never_reach_a_terminal(record):
    found = records_of(".zip", archive(("a\n\x1b[31m.record.json", record.to_bytes())), "x.zip").found
    assert found[0].place.isprintable()


def test_pages_with_several_records(record):
    element = record_template(record)
    assert len(records_of(".html", (element + element).encode(), "x.html").found) == 2
    for page in (f"<template data-propkit-record>{element}</template>", element * 501, "<template data-propkit-record></template>"):
        with pytest.raises(RecordError):
            records_of(".html", page.encode(), "x.html")
