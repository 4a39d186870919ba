"""RFC 8785 (JSON Canonicalization Scheme): the vectors printed in the RFC."""

import hashlib
import json
import struct

import pytest

from propkit.errors import RecordError
from propkit.record.canonical import canonical_bytes, digest_of, plain, sealed, text_digest, whole_digest

# RFC 8785, section 3.2.2: input and, in 3.2.4, the bytes of its canonical form.
SAMPLE = r"""{
  "numbers": [333333333.33333329, 1E30, 4.50, 2e-3, 0.000000000000000000000000001],
  "string": "\u20ac$\u000F\u000aA'\u0042\u0022\u005c\\\"\/",
  "literals": [null, true, false]
}"""
SAMPLE_BYTES = bytes.fromhex(
    "7b226c69746572616c73223a5b6e756c6c2c747275652c66616c73655d2c226e"
    "756d62657273223a5b3333333333333333332e333333333333332c31652b3330"
    "2c342e352c302e3030322c31652d32375d2c22737472696e67223a22e282ac24"
    "5c75303030665c6e4127425c225c5c5c5c5c222f227d"
)

# RFC 8785, section 3.2.3: keys sorted by UTF-16 code units; the order of the values is the expected one.
SORTED = {
    "\u20ac": "Euro Sign",
    "\r": "Carriage Return",
    "\ufb33": "Hebrew Letter Dalet With Dagesh",
    "1": "One",
    "\U0001f600": "Emoji: Grinning Face",
    "\u0080": "Control",
    "\u00f6": "Latin Small Letter O With Diaeresis",
}
SORTED_VALUES = [
    "Carriage Return",
    "One",
    "Control",
    "Latin Small Letter O With Diaeresis",
    "Euro Sign",
    "Emoji: Grinning Face",
    "Hebrew Letter Dalet With Dagesh",
]

# RFC 8785, appendix B: IEEE 754 bits and their ECMAScript form.
NUMBERS = [
    ("0000000000000000", "0"),
    ("8000000000000000", "0"),
    ("0000000000000001", "5e-324"),
    ("8000000000000001", "-5e-324"),
    ("7fefffffffffffff", "1.7976931348623157e+308"),
    ("ffefffffffffffff", "-1.7976931348623157e+308"),
    ("4340000000000000", "9007199254740992"),
    ("c340000000000000", "-9007199254740992"),
    ("4430000000000000", "295147905179352830000"),
    ("44b52d02c7e14af5", "9.999999999999997e+22"),
    ("44b52d02c7e14af6", "1e+23"),
    ("44b52d02c7e14af7", "1.0000000000000001e+23"),
    ("444b1ae4d6e2ef4e", "999999999999999700000"),
    ("444b1ae4d6e2ef4f", "999999999999999900000"),
    ("444b1ae4d6e2ef50", "1e+21"),
    ("3eb0c6f7a0b5ed8c", "9.999999999999997e-7"),
    ("3eb0c6f7a0b5ed8d", "0.000001"),
    ("41b3de4355555553", "333333333.3333332"),
    ("41b3de4355555554", "333333333.33333325"),
    ("41b3de4355555555", "333333333.3333333"),
    ("41b3de4355555556", "333333333.3333334"),
    ("41b3de4355555557", "333333333.33333343"),
    ("becbf647612f3696", "-0.0000033333333333333333"),
    ("43143ff3c1cb0959", "1424953923781206.2"),
]


def test_sample_of_the_rfc():
    assert canonical_bytes(json.loads(SAMPLE)) == SAMPLE_BYTES


def test_order_of_keys_of_the_rfc():
    text = canonical_bytes(SORTED).decode()
    assert list(json.loads(text).values()) == SORTED_VALUES


@pytest.mark.parametrize(("bits", "text"), NUMBERS)
def test_numbers_of_the_rfc(bits, text):
    assert canonical_bytes(struct.unpack(">d", bytes.fromhex(bits))[0]) == text.encode()


@pytest.mark.parametrize("bits", ["7fffffffffffffff", "7ff0000000000000", "fff0000000000000"])
def test_nan_and_infinities_have_no_form(bits):
    with pytest.raises(RecordError):
        canonical_bytes(struct.unpack(">d", bytes.fromhex(bits))[0])


@pytest.mark.parametrize("value", [2**53, {1: 2}, {"a": object()}, "\ud800"])
def test_what_has_no_form_is_refused(value):
    with pytest.raises(RecordError):
        canonical_bytes(value)


def test_digest_is_sha256_of_the_form():
    # FIPS 180-4 through hashlib, over the bytes that the RFC prints.
    assert digest_of(json.loads(SAMPLE)) == "sha256:" + hashlib.sha256(SAMPLE_BYTES).hexdigest()


def test_seals_do_not_see_how_an_editor_writes_numbers():
    document = sealed("propkit-record/1", {"b": 3500.0, "a": [1e-9]}, {"time": "x"})
    rewritten = {
        **json.loads('{"content": {"a": [0.000000001], "b": 3500}}'),
        **{key: value for key, value in document.items() if key != "content"},
    }
    assert whole_digest(rewritten) == document["digest"]
    assert digest_of(rewritten["content"]) == document["provenance"]["content_digest"]


def test_plain_values():
    assert plain({"a": float("inf"), "b": (1, 2**60), "c": float("nan")}) == {"a": "infinite", "b": [1, str(2**60)], "c": None}
    with pytest.raises(RecordError):
        plain(object())


def test_cell_digest_ignores_line_ends_only():
    assert text_digest("a\r\nb\n\n") == text_digest("a\nb")
    assert text_digest("a\n b") != text_digest("a\nb")
