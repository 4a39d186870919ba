import copy
import json
import pickle
from pathlib import Path

import pytest

import propkit as pk
from propkit.errors import InputError, RecordError, StorageError
from propkit.model.base import RECORD_MIME
from propkit.record import differences, schema
from propkit.record.canonical import sealed
from propkit.record.verify import judged, recomputed


def reseal(document):
    provenance = {name: value for name, value in document["provenance"].items() if name != "content_digest"}
    return pk.Record(sealed(document["schema"], document["content"], provenance))


def leaves(value, path=()):
    """Yield the path of every leaf of a plain value."""
    if isinstance(value, dict):
        for key, entry in value.items():
            yield from leaves(entry, (*path, key))
    elif isinstance(value, list):
        for place, entry in enumerate(value):
            yield from leaves(entry, (*path, place))
    else:
        yield path


def changed(value):
    """Return another value of the same kind."""
    if isinstance(value, bool):
        return not value
    if isinstance(value, int | float):
        return value * (1 + 1e-3) if value else 1e-3
    return f"{value}x" if isinstance(value, str) else 1.0


def with_leaf(document, path, value):
    made = copy.deepcopy(document)
    place = made
    for step in path[:-1]:
        place = place[step]
    place[path[-1]] = value
    return made


def get(document, path):
    for step in path:
        document = document[step]
    return document


def test_record_verifies(record):
    verification = record.verify()
    assert verification.status == "verified", str(verification)
    assert len(verification.leaves) > 250
    assert record.verify().exit_code == 0


def test_gas_record_verifies(gas_record):
    assert gas_record.verify().status == "verified", str(gas_record.verify())


def test_form_is_published_and_valid(record):
    from jsonschema import Draft202012Validator

    Draft202012Validator.check_schema(schema.schema())
    Draft202012Validator(schema.schema()).validate(record.document)
    assert set(record.document) == {"schema", "content", "provenance", "digest"}


def test_a_chain_fits_in_30_kB(record):
    assert len(record.to_bytes()) <= 30_000
    case = pk.PropellantCase("NTO", "MMH", mixture_ratio=1.9)
    nozzle = pk.Nozzle(pk.Chamber(case, pressure="2.4 MPa", contraction_ratio=2), area_ratio=80, throat_diameter="40 mm", flow="frozen")
    assert len(pk.Performance(nozzle, ambient="vacuum").record().to_bytes()) <= 30_000


def test_numbers_are_those_of_the_object(record, perf):
    results = record.content["objects"]["performance"]["results"]
    assert results["thrust"] == {"value": perf.thrust.to("N").magnitude, "unit": "N"}
    row = next(row for row in record.content["stations"]["rows"] if row["station"] == "throat")
    assert row["temperature"] == perf.nozzle.throat.temperature.to("K").magnitude
    assert record.content["objects"]["chamber"]["inputs"]["pressure"] == {"kind": "given", "typed": "9.7 MPa", "value": 9.7e6, "unit": "Pa"}
    assert min(min(part.values()) for part in record.content["composition"].values()) >= 1e-8


def test_save_load(tmp_path, record):
    path = record.save(tmp_path / "engine.record.json")
    assert pk.Record.load(path) == record
    assert [entry.name for entry in tmp_path.iterdir()] == ["engine.record.json"]
    assert path.read_bytes() == record.to_bytes()


def test_record_is_immutable_and_portable(record):
    record.document["content"]["title"] = "other"
    record.content["title"] = "other"
    assert record.title == "Test engine, first estimate"
    assert pickle.loads(pickle.dumps(record)) == record
    assert copy.deepcopy(record) is record
    assert record.calculation.si("thrust") == record.content["objects"]["performance"]["results"]["thrust"]["value"]


EVERY = 4
"""Every fourth leaf in the default run, from another start for each of the two tests; all of them in the full run."""


def test_any_change_without_resealing_fails(record):
    check_without_resealing(record, EVERY, 0)


@pytest.mark.full
def test_any_change_fails_with_and_without_resealing_at_length(record):
    check_without_resealing(record, 1, 0)
    check_after_resealing(record, 1, 0, 300)


def check_without_resealing(record, step, start):
    document = record.document
    for path in list(leaves(document))[start::step]:
        tampered = with_leaf(document, path, changed(get(document, path)))
        try:
            assert not pk.Record(tampered).sealed, path
        except RecordError:
            continue
    assert record.sealed
    document["content"]["stations"]["rows"][1]["pressure"] *= 1.001
    verification = pk.Record(document).verify()
    assert verification.exit_code == 1
    assert "changed after it was sealed" in str(verification)


FREE = {"title", "author", "purpose", "notes"}


def test_any_change_fails_after_resealing(record):
    check_after_resealing(record, EVERY, 1, 75)


def check_after_resealing(record, step, start, least):
    """The recipe decides what is recomputed; all other leaves are compared with one recomputation of the untouched recipe."""
    document = record.document
    again = recomputed(document["content"])
    assert judged(document, again, "record").status == "verified"
    tried = 0
    for path in list(leaves(document["content"]))[start::step]:
        if path[0] in (*FREE, "recipe") or path[-1] == "checksum":
            continue
        tampered = with_leaf(document, ("content", *path), changed(get(document["content"], path)))
        try:
            resealed = reseal(tampered)
        except RecordError:
            continue
        tried += 1
        assert judged(resealed.document, again, "record").exit_code == 1, path
    assert tried > least


@pytest.mark.parametrize("path", [
    ("objects", "performance", "results", "specific_impulse", "value"),
    ("objects", "performance", "results", "thrust", "unit"),
    ("objects", "chamber", "inputs", "pressure", "typed"),
    ("recipe", "inputs", "nozzle", "inputs", "area_ratio"),
    ("recipe", "inputs", "nozzle", "inputs", "chamber", "inputs", "case", "inputs", "oxidizer"),
    ("assumptions", 0, "statement"),
])  # fmt: skip
def test_a_change_fails_after_resealing_when_all_is_recomputed(record, path):
    tampered = with_leaf(record.document, ("content", *path), changed(get(record.content, path)))
    assert reseal(tampered).verify().exit_code == 1


def test_a_missing_or_added_entry_fails_after_resealing(record):
    for kind, part in (("performance", "results"), ("chamber", "inputs"), ("nozzle", "results")):
        document = record.document
        entries = document["content"]["objects"][kind][part]
        name = sorted(entries)[0]
        entry = entries.pop(name)
        assert reseal(document).verify().exit_code == 1
        entries |= {
            name: entry,
            "another": {"kind": "given", "value": 1.0, "unit": "m"} if part == "inputs" else {"value": 1.0, "unit": "m"},
        }
        assert reseal(document).verify().exit_code == 1
    document = record.document
    document["content"]["composition"]["throat"]["Xe"] = 1e-4
    assert reseal(document).verify().exit_code == 1
    document = record.document
    del document["content"]["stations"]["rows"][0]
    assert reseal(document).verify().exit_code == 1


@pytest.mark.parametrize("name", ["propkit", "numpy", "python", "platform", "cantera"])
def test_another_version_is_reported_not_failed(record, name):
    document = record.document
    document["provenance"]["versions"][name] = "0.0.1"
    verification = reseal(document).verify()
    assert verification.status == "verified with notes"
    assert any(name in check.name and "0.0.1" in check.detail for check in verification.checks)


def test_other_data_are_reported_with_their_effect(record):
    document = record.document
    document["content"]["basis"]["checksum"] = "sha256:" + "0" * 64
    thrust = document["content"]["objects"]["performance"]["results"]["thrust"]
    thrust["value"] *= 1 + 1e-5
    verification = reseal(document).verify()
    assert verification.status == "verified with notes"
    assert "objects.performance.results.thrust.value" in str(verification)
    thrust["value"] *= 1.01
    assert reseal(document).verify().status == "mismatch"


def test_free_text_is_not_checked_and_that_is_said(record):
    document = record.document
    document["content"]["notes"] = "Something else."
    verification = reseal(document).verify()
    assert verification.ok
    assert "not checked" in str(verification)


@pytest.mark.parametrize(
    "recipe",
    [
        {"object": "Record", "inputs": {}},
        {"object": "Performance", "inputs": {"nozzle": "x", "ambient": "vacuum"}},
        {"object": "os.system", "inputs": {"command": "true"}},
        {"object": "Propellant", "inputs": {"library_name": "LOX"}},
    ],
)
def test_a_recipe_that_makes_something_else_is_a_mismatch(record, recipe):
    document = record.document
    document["content"]["recipe"] = recipe
    assert reseal(document).verify().exit_code == 1


def test_other_schema_versions(record):
    for text in ("propkit-record/2", "propkit-record/0", "propkit-record/x", "other", None, 3):
        document = record.document
        document["schema"] = text
        with pytest.raises(RecordError):
            pk.Record(document)


def test_migration_reads_an_older_form(record, monkeypatch):
    """A document of an invented version 0, whose texts lay in one mapping."""

    def migrate(document):
        content = {name: value for name, value in document["content"].items() if name != "texts"}
        return {**document, "content": {**content, **document["content"]["texts"]}}

    monkeypatch.setitem(schema.MIGRATIONS, 0, migrate)
    content = record.content
    texts = {name: content.pop(name) for name in FREE}
    provenance = {name: value for name, value in record.provenance.items() if name != "content_digest"}
    old = sealed("propkit-record/0", {**content, "texts": texts}, provenance)
    verification = pk.Record(old).verify()
    assert verification.ok, str(verification)
    assert "version 0" in str(verification)
    old["content"]["description"] = "changed"
    assert pk.Record(old).verify().exit_code == 1


@pytest.mark.parametrize("path", ["", None, 7, "x.txt", "x"])
def test_a_bad_name_is_refused(record, path):
    with pytest.raises(InputError):
        record.save(path)


def test_an_unwritable_place_is_refused_and_nothing_is_left(record, tmp_path):
    with pytest.raises(StorageError):
        record.save(tmp_path / "no folder" / "x.json")
    (tmp_path / "x.json").mkdir()
    with pytest.raises(StorageError):
        record.save(tmp_path / "x.json")
    assert [entry.name for entry in tmp_path.iterdir()] == ["x.json"]


@pytest.mark.parametrize("texts", [{"title": 3}, {"author": "x" * 300}, {"notes": "a\x00"}, {"purpose": "\ud800"}])
def test_bad_texts_are_refused(perf, texts):
    with pytest.raises(InputError):
        perf.record(**texts)


def test_texts_may_hold_spaces_of_every_width(perf):
    title = "Thrust\u00a0of 12\u202f000\u2009N, \u2003 \u0928\u094d\u200d\U0001f680"
    record = perf.record(title=title)
    assert record.title == title
    assert record.verify().ok
    for bad in ("\u202e", "\x07", "\u2028", "\ufeff"):
        with pytest.raises(InputError):
            perf.record(title=f"a{bad}")


WRONG = (None, True, 3, -1.5, "x", [], {}, [[]], {"a": {}}, "infinite")
"""Values of every kind, for places that ask for another."""


def places(value, path=()):
    """Yield the path of every entry, mappings and lists included."""
    for key, entry in value.items() if isinstance(value, dict) else enumerate(value) if isinstance(value, list) else ():
        yield (*path, key)
        yield from places(entry, (*path, key))


def check_wrong_types(record, step):
    """Whatever stands at a place, only our errors come out of loading, judging, showing and comparing."""
    document = record.document
    again = recomputed(document["content"])
    for number, path in enumerate(list(places(document))[::step]):
        for wrong in WRONG if step == 1 else (WRONG[number % len(WRONG)],):
            try:
                changed_record = pk.Record(with_leaf(document, path, wrong))
                str(judged(changed_record.document, again, "record"))
                str(changed_record.compare(record))
                changed_record._repr_mimebundle_()
            except pk.PropkitError:
                continue


def test_wrong_types_give_our_errors(record):
    check_wrong_types(record, 3)


@pytest.mark.full
def test_wrong_types_give_our_errors_at_length(record):
    check_wrong_types(record, 1)


@pytest.mark.parametrize("wrong", [[], {}, [[]], 3, None])
def test_a_recipe_that_names_no_class_is_refused(record, wrong):
    document = record.document
    document["content"]["recipe"]["inputs"]["nozzle"]["object"] = wrong
    with pytest.raises(RecordError):
        assert pk.Record(document).calculation


def test_control_characters_never_reach_a_terminal(record):
    document = record.document
    document["content"]["title"] = "\x1b[31mred\r\nx.json: verified \u202e"
    odd = reseal(document)
    for text in (str(odd.verify("\x1b[2J.json")), str(odd.compare(record)), str(odd)):
        assert not set(text) & {"\x1b", "\r", "\u202e"}
    assert "\\x1b[31mred" in str(odd.verify())


def test_lists_have_a_limit(record):
    document = record.document
    document["content"]["cautions"] = ["x"] * 1001
    with pytest.raises(RecordError, match="cautions"):
        pk.Record(document)


def test_bundle_is_a_record(perf):
    from propkit.record import bundle_of

    document = json.loads(json.dumps(bundle_of(perf)[RECORD_MIME]))
    assert pk.Record(document).verify().status == "verified"
    assert pk.Record(document).title == "Test engine"


def test_compare(record, perf):
    assert record.compare(record).same
    other = perf.replace({"chamber.pressure": "8 MPa"}).record(title="Other")
    comparison = record.compare(other)
    assert not comparison.same
    text = str(comparison)
    assert "chamber.pressure" in text
    assert "-17.53 %" in text
    assert "<script" not in comparison.to_page()


def test_outcome_forms(record):
    from xml.etree import ElementTree

    document = record.document
    document["content"]["title"] = "<b>&\"'"
    document["content"]["objects"]["performance"]["results"]["thrust"]["value"] *= 2
    verification = reseal(document).verify("a<b>.json")
    suite = ElementTree.fromstring(verification.to_junit())
    assert int(suite.get("failures")) == 1
    assert suite.get("name").startswith("a<b>.json")
    assert "<b>&amp;" not in verification.to_html()
    assert json.loads(json.dumps(verification.to_dict()))["differences"][0]["path"] == "objects.performance.results.thrust.value"


@pytest.mark.parametrize("value", [float("nan"), float("inf"), 2**53, object(), {1: 2}])
def test_what_no_record_holds(record, value):
    document = record.document
    document["content"]["objects"]["performance"]["results"]["thrust"]["value"] = value
    with pytest.raises(RecordError):
        pk.Record(document)


SAMPLES = sorted((Path(__file__).parent / "samples").glob("record-v*.json"))


@pytest.mark.parametrize("path", SAMPLES, ids=[path.stem for path in SAMPLES])
def test_stored_samples_of_every_version_stay_readable(path):
    """A record of each schema version as it was written; words may change since, numbers may not."""
    stored = pk.Record.load(path)
    assert stored.sealed
    assert str(stored)
    found = [
        leaf
        for leaf in differences.leaves(stored.content, recomputed(stored.content))
        if leaf.group in ("results", "stations") and leaf.difference is not None
    ]
    assert len(found) > 60
    assert max(leaf.difference for leaf in found) < 1e-6


def test_every_version_has_a_sample():
    assert {path.stem for path in SAMPLES} == {f"record-v{version}" for version in range(1, schema.VERSION + 1)}


def test_records_of_one_calculation_share_what_is_recomputed(record, perf):
    known = {}
    other = perf.record(title="Other")
    assert record.verify(known=known).status == other.verify(known=known).status == "verified"
    assert len(known) == 1
    document = other.document
    document["content"]["objects"]["performance"]["results"]["thrust"]["value"] *= 1.01
    assert reseal(document).verify(known=known).exit_code == 1
    assert other.verify(known=known).exit_code == 0
