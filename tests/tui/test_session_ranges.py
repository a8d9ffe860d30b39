"""Every number of a session text: its ends are taken, what lies beyond or is no number is not."""

from __future__ import annotations

import math

import pytest

from physics.ranges import Range
from tui.session import tables
from tui.session.read import read_session
from tui.session.refusal import SessionError, has_controls

HEAD = "format = 1\n"
PLAIN = "edge_eV = 0.0\nmass = 0.067\n"
LAYER = "[[layer]]\nedge_eV = 0.3\nmass = 0.09\nthickness_nm = 2.0\n"
STACK = f"[left]\n{PLAIN}{LAYER}[right]\n{PLAIN}"
TABLES = [
    ("conditions", "[conditions]", tables.CONDITIONS, f"{STACK}[conditions]\n"),
    ("growth", "[growth]", tables.GROWTH, f"{STACK}[growth]\n"),
    ("left", "[left]", tables.CONTACT, f"{LAYER}[right]\n{PLAIN}[left]\n{PLAIN}"),
    ("right", "[right]", tables.CONTACT, f"{LAYER}[left]\n{PLAIN}[right]\n{PLAIN}"),
    ("layer 2", "[[layer]]", tables.LAYER, STACK + LAYER),
    ("material Own", "[material.Own]", tables.MATERIAL, f"{STACK}[material.Own]\n{PLAIN}"),
    ("view", "[view]", tables.VIEW, f"{STACK}[view]\n"),
]
NUMBERS = [
    pytest.param(name, text, key, entry, id=f"{name}-{key}")
    for name, _, keys, text in TABLES
    for key, entry in keys.items()
    if isinstance(entry, Range)
]
TEXTS = [
    pytest.param(name, text, key, id=f"{name}-{key}")
    for name, _, keys, text in TABLES
    for key, entry in keys.items()
    if isinstance(entry, tables.Text)
]


def stated(text: str, key: str, value: str) -> str:
    """Give a text whose last table states a key, and last of all."""
    start = text.rindex("[", 0, text.rindex("]"))
    kept = [line for line in text[start:].splitlines() if not line.startswith(f"{key} =")]
    return HEAD + text[:start] + "\n".join([*kept, f"{key} = {value}\n"])


def refusal(text: str) -> SessionError:
    with pytest.raises(SessionError) as caught:
        read_session(text, "x.toml")
    assert not has_controls(str(caught.value))
    return caught.value


def outside(entry: Range) -> list[float]:
    below = entry.low if entry.open_below else math.nextafter(entry.low, -math.inf)
    return [below, math.nextafter(entry.high, math.inf), -1e300, 1e300]


@pytest.mark.parametrize(("name", "text", "key", "entry"), NUMBERS)
def test_what_lies_outside(name: str, text: str, key: str, entry: Range) -> None:
    for value in outside(entry):
        bad = stated(text, key, repr(value))
        error = refusal(bad)
        assert (error.key, error.line) == (f"{name} {key}", bad.count("\n")), value
        assert error.allowed == entry.allowed
        assert str(value) in error.found


@pytest.mark.parametrize(("name", "text", "key", "entry"), NUMBERS)
def test_what_lies_inside(name: str, text: str, key: str, entry: Range) -> None:
    low = math.nextafter(entry.low, math.inf) if entry.open_below else entry.low
    for value in (low, entry.high):
        read_session(stated(text, key, repr(value)), "x.toml")


@pytest.mark.parametrize(
    ("value", "found"),
    [
        ("nan", "not a number"),
        ("-nan", "not a number"),
        ("inf", "infinite"),
        ("-inf", "infinite"),
        ("1e999", "infinite"),
        ("true", "true"),
        ("false", "false"),
        ('"1"', "'1'"),
        ("[1.0]", "a list"),
        ("{ is = 1.0 }", "a table"),
        ("1979-05-27", "1979-05-27"),
        ("07:32:00", "07:32:00"),
    ],
)
@pytest.mark.parametrize(("name", "text", "key", "entry"), NUMBERS)
def test_what_is_no_number(
    name: str, text: str, key: str, entry: Range, *, value: str, found: str
) -> None:
    bad = stated(text, key, value)
    error = refusal(bad)
    assert (error.key, error.line) == (f"{name} {key}", bad.count("\n"))
    assert error.found == f"is {found}"
    assert entry.allowed in error.allowed


@pytest.mark.parametrize("value", ["3", "true", '["a"]', '"a\\u001b[2J"', '"a\\nb"', '"\\u009b"'])
@pytest.mark.parametrize(("name", "text", "key"), TEXTS)
def test_what_is_no_text(name: str, text: str, key: str, value: str) -> None:
    error = refusal(stated(text, key, value))
    assert error.key == f"{name} {key}"
    assert "text on one line" in error.allowed or key in ("field", "charge")


@pytest.mark.parametrize(
    ("key", "meant"),
    [
        ("thickness", "thickness_nm or thickness_ml"),
        ("donors", "donors_cm3"),
        ("edge", "edge_eV"),
        ("to_edge", "to_edge_eV"),
        ("thicknes_nm", "did you mean thickness_nm?"),
        ("Mass", "did you mean mass?"),
        ("matrial", "did you mean material?"),
    ],
)
def test_keys_that_are_nearly_right(key: str, meant: str) -> None:
    error = refusal(stated(STACK + LAYER, key, "2"))
    assert error.key == f"layer 2 {key}"
    assert meant in error.allowed
