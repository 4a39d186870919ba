import json

import pytest
from hypothesis import HealthCheck, given, settings
from hypothesis import strategies as st

import propkit as pk
from propkit.errors import PropkitError, RecordError, StorageError
from propkit.record.containers import records_of
from propkit.record.reading import parse_json, read_file

BAD = {
    "nan": '{"a": NaN}',
    "infinity": '{"a": -Infinity}',
    "overflow": '{"a": 1e400}',
    "twice": '{"a": 1, "a": 2}',
    "deep list": "[" * 65 + "]" * 65,
    "deep mapping": '{"a":' * 70 + "1" + "}" * 70,
    "very deep": "[" * 200_000,
    "truncated": '{"a": [1, 2',
    "empty": "",
    "long integer": "1" * 5000,
    "surrogate": '{"a": "\\ud800"}',
    "surrogate key": '{"\\udc00": 1}',
    "surrogate in a list": '{"a": ["\\ud800"]}',
    "surrogate in nothing else": '"\\uD800"',
    "surrogate in lists": '[[{"a": [["\\uDFFF"]]}]]',
    "trailing": "{} {}",
    "control": '{"a": "\n"}',
}


@pytest.mark.parametrize("text", BAD.values(), ids=BAD.keys())
def test_bad_json_is_a_record_error_without_a_chain(text):
    with pytest.raises(RecordError) as caught:
        parse_json(text)
    assert caught.value.__cause__ is None
    assert caught.value.__context__ is None or caught.value.__suppress_context__


def test_depth_is_not_counted_inside_texts():
    assert parse_json(json.dumps({"a": "[" * 1000})) == {"a": "[" * 1000}
    assert parse_json("[" * 64 + "]" * 64)


def test_not_utf8():
    with pytest.raises(RecordError):
        parse_json(b'{"a": "\xff"}')


def test_size_limit(tmp_path):
    with pytest.raises(RecordError, match="MB"):
        parse_json(b" " * 50_000_001)
    file = tmp_path / "large.json"
    file.write_bytes(b" " * 1001)
    with pytest.raises(RecordError):
        read_file(file, 1000)


def test_missing_file_and_folder(tmp_path):
    for path in (tmp_path / "none.json", tmp_path):
        with pytest.raises(StorageError):
            read_file(path)
    with pytest.raises(PropkitError):
        pk.Record.load(tmp_path / "x\0.json")


JSON = st.recursive(
    st.none() | st.booleans() | st.integers(-(2**53) + 1, 2**53 - 1) | st.floats(allow_nan=False, allow_infinity=False) | st.text(),
    lambda inner: st.lists(inner, max_size=4) | st.dictionaries(st.text(max_size=5), inner, max_size=4),
    max_leaves=20,
)


@given(JSON)
def test_json_survives(value):
    assert parse_json(json.dumps(value)) == value


@settings(max_examples=300, suppress_health_check=[HealthCheck.too_slow])
@given(JSON)
def test_no_other_json_is_a_record(value):
    with pytest.raises(RecordError):
        pk.Record.from_bytes(json.dumps(value))


@settings(max_examples=300)
@given(st.sampled_from([".json", ".ipynb", ".html", ".zip"]), st.binary(max_size=300))
def test_noise_gives_a_record_error_or_nothing(suffix, data):
    try:
        contents = records_of(suffix, data, "noise")
    except PropkitError:
        return
    assert not contents.found


def mutate(data: bytes, draw) -> bytes:
    """Return the bytes of a file with a part cut, doubled or overwritten."""
    start = draw(st.integers(0, len(data) - 1))
    stop = draw(st.integers(start, min(start + 40, len(data))))
    replacement = draw(
        st.sampled_from([b"", data[start:stop] * 2])
        | st.binary(max_size=8)
        | st.sampled_from([b"NaN", b"1e999", b"[" * 99, b"\\ud800", b'"', b"-0", b"null"])
    )
    return data[:start] + replacement + data[stop:]


def check_mutations(record, examples):
    data = record.to_bytes()

    @settings(max_examples=examples, deadline=None, database=None, suppress_health_check=list(HealthCheck))
    @given(st.data())
    def run(source):
        changed = mutate(data, source.draw)
        try:
            found = pk.Record.from_bytes(changed)
        except PropkitError:
            return
        if found != record:
            assert not found.sealed

    run()


def test_mutated_bytes(record):
    check_mutations(record, 2000)


@pytest.mark.full
def test_mutated_bytes_at_length(record):
    check_mutations(record, 100_000)
