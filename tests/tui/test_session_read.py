"""The session text is read strictly, and refusals say file, line, key, finding and remedy."""

from __future__ import annotations

import os
from pathlib import Path

import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from tui.session.demo import demo_text
from tui.session.model import ContactEntry, LayerEntry, MaterialEntry, View
from tui.session.read import MAX_BYTES, decode, load, read_session
from tui.session.refusal import SessionError, has_controls

GOOD = """\
format = 1
title = "t"

[conditions]
temperature_K = 77
bias_V = 0.1

[left]
edge_eV = 0.0
mass = 0.067

[[layer]]
label = "b"
edge_eV = 0.3
mass = 0.092
thickness_nm = 2

[[layer]]
edge_eV = 0.3
to_edge_eV = 0.1
mass = 0.092
thickness_nm = 3.0
donors_cm3 = 1e17
permittivity = 12.0

[right]
edge_eV = 0
mass = 0.067

[material.Mine]
edge_eV = 0.21
mass = 0.085
monolayer_nm = 0.283

[view]
from_eV = -0.1
max_width_eV = 0.05
"""


def refused(text: str) -> SessionError:
    with pytest.raises(SessionError) as caught:
        read_session(text, "my.toml")
    assert not has_controls(str(caught.value))
    assert str(caught.value).startswith("my.toml")
    return caught.value


def test_all_is_read() -> None:
    session = read_session(GOOD, "my.toml")
    assert session.title == "t"
    assert (session.conditions.temperature_K, session.conditions.bias_V) == (77.0, 0.1)
    assert session.left == ContactEntry(edge_eV=0.0, mass=0.067)
    assert session.layers[0] == LayerEntry(label="b", edge_eV=0.3, mass=0.092, thickness_nm=2.0)
    assert session.layers[1].to_edge_eV == 0.1
    assert session.materials == (MaterialEntry("Mine", 0.21, 0.085, None, 0.283),)
    assert session.view == View(-0.1, None, 0.05)


def test_the_demo_is_good() -> None:
    assert len(read_session(demo_text(), "demo").layers) == 5


BAD = [
    ("format = 1", "format = 2", "format", 1, "this version reads 1"),
    ("format = 1", "format = true", "format", 1, "this version reads 1"),
    ("format = 1\n", "", "format", None, "write format = 1"),
    ('title = "t"', "title = 3", "title", 2, "it is a text"),
    ('title = "t"', 'title = "a\\u001b[2J"', "title", 2, "without control characters"),
    ('title = "t"', 'titel = "t"', "titel", 2, "did you mean title?"),
    ("[conditions]", "[condition]", "condition", 4, "did you mean conditions?"),
    ("[conditions]", "[scans]", "scans", 4, "known are"),
    ("temperature_K = 77", "temperature = 77", "conditions temperature", 5, "temperature_K"),
    ("temperature_K = 77", "mobility = 8e3", "conditions mobility", 5, "mobility_cm2_Vs"),
    ("temperature_K = 77", "dephasing = 0", "conditions dephasing", 5, "dephasing_eV"),
    ("temperature_K = 77", "temperature_K = 0", "conditions temperature_K", 5, "0.01 and 2000"),
    ("temperature_K = 77", "temperature_K = -4", "conditions temperature_K", 5, "0.01 and 2000"),
    ("bias_V = 0.1", "bias_V = nan", "conditions bias_V", 6, "-50 and 50 V"),
    ("bias_V = 0.1", "bias_V = 1e999", "conditions bias_V", 6, "-50 and 50 V"),
    ("bias_V = 0.1", "bias_V = true", "conditions bias_V", 6, "a number is expected"),
    ("bias_V = 0.1", 'bias_V = "0.1"', "conditions bias_V", 6, "a number is expected"),
    ("bias_V = 0.1", 'band = "Kane"', "conditions band", 6, '"parabolic" or "kane"'),
    ("permittivity = 12.0", "gap_eV = 0", "layer 2 gap_eV", 24, "1e-3 and 20 eV"),
    ("permittivity = 12.0", "gap = 1", "layer 2 gap", 24, "write gap_eV"),
    ("bias_V = 0.1", 'field = "bent"', "conditions field", 6, '"uniform" or "screened"'),
    ("bias_V = 0.1", 'charge = "none"', "conditions charge", 6, '"semi-classical" or "quantum"'),
    ("mass = 0.067\n\n[[", "\n\n[[", "left", 8, "edge_eV with mass"),
    ("mass = 0.092\nthickness_nm = 2\n", "mass = 0\nthickness_nm = 2\n", "layer 1 mass", 15, "m0"),
    ("thickness_nm = 2\n", "thickness_nm = 0\n", "layer 1 thickness_nm", 16, "1e-6"),
    ("thickness_nm = 2\n", "thickness_nm = -1\n", "layer 1 thickness_nm", 16, "1e-6"),
    (
        "thickness_nm = 2\n",
        "thickness = 2\n",
        "layer 1 thickness",
        16,
        "thickness_nm or thickness_ml",
    ),
    ("thickness_nm = 2\n", "\n", "layer 1", 12, "thickness_nm or thickness_ml"),
    ("donors_cm3 = 1e17", "donors_cm3 = -1", "layer 2 donors_cm3", 23, "0 and 1e22"),
    ("donors_cm3 = 1e17", f"donors_cm3 = {10**400}", "layer 2 donors_cm3", 23, "0 and 1e22"),
    ("permittivity = 12.0", "permittivity = 0.5", "layer 2 permittivity", 24, "1 and 1e4"),
    ("permittivity = 12.0", "colour = 3", "layer 2 colour", 24, "known are"),
    ("[right]\n", "[rigth]\n", "rigth", 26, "did you mean right?"),
    ("edge_eV = 0.21", "edge_eV = inf", "material Mine edge_eV", 31, "-100 and 100"),
    ("edge_eV = 0.21\n", "", "material Mine", 30, "edge_eV and mass"),
    ("from_eV = -0.1", "from_eV = 0.3\nto_eV = 0.2", "view to_eV", 37, "from_eV below to_eV"),
    ("max_width_eV = 0.05", "max_width_eV = 0", "view max_width_eV", 37, "above 0"),
]


@pytest.mark.parametrize(("old", "new", "key", "line", "remedy"), BAD)
def test_refusals(old: str, new: str, key: str, line: int | None, remedy: str) -> None:
    assert old in GOOD
    error = refused(GOOD.replace(old, new, 1))
    assert error.key == key
    assert error.line == line
    assert remedy in error.allowed


@pytest.mark.parametrize("header", ["[left]", "[right]"])
def test_missing_contact(header: str) -> None:
    start = GOOD.index(header)
    end = GOOD.index("\n\n", start)
    error = refused(GOOD[:start] + GOOD[end:])
    assert error.key == header
    assert "two contacts" in error.allowed


def test_no_layers() -> None:
    start, end = GOOD.index("[[layer]]"), GOOD.index("[right]")
    assert refused(GOOD[:start] + GOOD[end:]).key == "[[layer]]"
    assert "at least one" in refused("layer = []\n" + GOOD[:start] + GOOD[end:]).allowed
    assert "[[layer]]" in refused("layer = 3\n" + GOOD[:start] + GOOD[end:]).allowed


def test_syntax_errors_have_their_line() -> None:
    assert refused(GOOD.replace("bias_V = 0.1", "bias_V = ")).line == 6
    assert refused(GOOD.replace("bias_V = 0.1", "temperature_K = 3")).line == 6  # said twice
    assert refused("format = 1\nx = [[[[").allowed
    assert "no TOML" in refused('format = "').found
    assert refused("x = " + "[" * 100_000).allowed


def test_lines_inside_long_strings_are_no_keys() -> None:
    notes = 'notes = """\n[left]\nmass = 3\n"""\n'
    text = GOOD.replace("[conditions]", notes + "\n[conditions]").replace(
        "bias_V = 0.1", "bias_V = 99"
    )
    assert refused(text).line == 11


def test_windows_line_ends_and_byte_order_mark() -> None:
    data = b"\xef\xbb\xbf" + GOOD.replace("\n", "\r\n").encode()
    assert read_session(decode(data, "x"), "x") == read_session(GOOD, "x")


@pytest.mark.parametrize(
    ("data", "word"),
    [
        (b"\xff\xfe\x00f", "UTF-8"),
        (b"format = 1\n\0", "NUL"),
        (b"#" * (MAX_BYTES + 1), "larger"),
    ],
)
def test_no_text(data: bytes, word: str) -> None:
    with pytest.raises(SessionError, match=word):
        decode(data, "x")


def test_files_that_cannot_be_read(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    with pytest.raises(SessionError, match="no such file"):
        load(tmp_path / "absent.toml")
    with pytest.raises(SessionError, match="it is a folder"):
        load(tmp_path)
    big = tmp_path / "big.toml"
    with big.open("wb") as file:
        file.truncate(10_000_000)
    with pytest.raises(SessionError, match="larger"):
        load(big)
    os.mkfifo(tmp_path / "pipe")
    with pytest.raises(SessionError, match="no regular file"):
        load(tmp_path / "pipe")
    locked = tmp_path / "locked.toml"
    locked.write_text(GOOD)

    def deny(path: Path) -> bytes:
        raise PermissionError(13, "Permission denied", str(path))

    monkeypatch.setattr(
        Path, "read_bytes", deny
    )  # the tests may run as root, whom nothing is denied
    with pytest.raises(SessionError, match="permission denied"):
        load(locked)


def test_ten_thousand_layers() -> None:
    layer = "[[layer]]\nedge_eV = 0.3\nmass = 0.09\nthickness_nm = 1\n"
    head = "format = 1\n[left]\nedge_eV = 0\nmass = 0.07\n[right]\nedge_eV = 0\nmass = 0.07\n"
    assert len(read_session(head + layer * 10_000, "x").layers) == 10_000
    error = refused(head + layer * 9_999 + layer.replace("= 1", "= -1"))
    assert (error.key, error.line) == ("layer 10000 thickness_nm", 7 + 4 * 10_000)


@settings(max_examples=300, deadline=None)
@given(st.text(max_size=300))
def test_no_text_whatever_does_more_than_be_refused(text: str) -> None:
    with pytest.raises(SessionError) as caught:
        read_session(text, "x")
    assert not has_controls(str(caught.value))


@settings(max_examples=200, deadline=None)
@given(st.data())
def test_a_good_text_with_a_piece_replaced(data: st.DataObject) -> None:
    start = data.draw(st.integers(0, len(GOOD)))
    piece = data.draw(st.text(max_size=12))
    text = GOOD[:start] + piece + GOOD[start + data.draw(st.integers(0, 12)) :]
    said = ""
    try:
        read_session(text, "x")
    except SessionError as error:
        said = str(error)
    assert not has_controls(said)
