"""Writing back: comments, order and spellings survive, and a save is all or nothing."""

from __future__ import annotations

import os
import stat
from dataclasses import replace
from pathlib import Path

import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from tui.session import save as saving
from tui.session.demo import demo_text
from tui.session.model import (
    Conditions,
    ContactEntry,
    Growth,
    LayerEntry,
    MaterialEntry,
    Session,
    View,
)
from tui.session.read import read_session
from tui.session.refusal import SessionError
from tui.session.save import save
from tui.session.write import write_session

COMMENTED = """\
# the head
format = 1   # one
title = "old"

[conditions]   # cold
temperature_K = 77   # nitrogen
bias_V = 1e-1

# left first
[left]
mass = 0.067   # light
edge_eV = 0

# barrier one
[[layer]]
thickness_nm = 2.0   # thin
edge_eV = +3e-1
mass = 0.092

# the well
[[layer]]
edge_eV = 0.0
mass = 0.067
thickness_nm = 5.00

# barrier two
[[layer]]
edge_eV = 0.3
mass = 0.092
thickness_nm = 2.5

[right]
edge_eV = 0
mass = 0.067
# the end
"""
SESSION = read_session(COMMENTED, "c")


def written(session: Session, original: str | None = COMMENTED) -> str:
    text = write_session(session, original)
    assert read_session(text, "again") == session
    return text


def comments(text: str) -> set[str]:
    return {line[line.index("#") :].strip() for line in text.split("\n") if "#" in line}


def layers(text: str) -> list[str]:
    """Comment above and first value of each layer, in order."""
    return [part.strip().split("\n")[-1] for part in text.split("[[layer]]")[:-1]]


def test_nothing_changed_is_the_same_text() -> None:
    assert write_session(SESSION, COMMENTED) == COMMENTED
    demo = demo_text()
    assert write_session(read_session(demo, "d"), demo) == demo


def test_one_value() -> None:
    well = replace(SESSION.layers[1], thickness_nm=5.5)
    session = replace(SESSION, layers=(SESSION.layers[0], well, SESSION.layers[2]))
    assert written(session) == COMMENTED.replace("thickness_nm = 5.00", "thickness_nm = 5.5")


def test_values_at_the_top_and_in_tables() -> None:
    session = replace(SESSION, title="new", conditions=replace(SESSION.conditions, bias_V=0.2))
    text = COMMENTED.replace('"old"', '"new"').replace("1e-1", "0.2")
    assert written(session) == text


def test_the_band_is_written_where_it_is_not_parabolic() -> None:
    kane = replace(SESSION, conditions=replace(SESSION.conditions, band="kane"))
    text = written(kane)
    assert 'band = "kane"' in text
    assert comments(text) == comments(COMMENTED)
    assert 'band = "kane"' in written(kane, None)
    assert "band" not in written(SESSION, None)
    assert "kane" not in written(SESSION, text)


def test_a_layer_moves_with_its_comment() -> None:
    first, well, last = SESSION.layers
    text = written(replace(SESSION, layers=(well, first, last)))
    assert layers(text) == ["# the well", "# barrier one", "# barrier two"]
    assert comments(text) == comments(COMMENTED)


def test_a_layer_goes_and_one_comes() -> None:
    first, well, last = SESSION.layers
    text = written(replace(SESSION, layers=(first, last)))
    assert layers(text) == ["# barrier one", "# barrier two"]
    fresh = LayerEntry(label="new", edge_eV=0.1, mass=0.07, thickness_nm=1.0)
    text = written(replace(SESSION, layers=(first, fresh, well, last)))
    assert comments(text) == comments(COMMENTED)
    assert '\n\n[[layer]]\nlabel = "new"' in text


def test_a_duplicate_leaves_the_rest_alone() -> None:
    first, well, last = SESSION.layers
    text = written(replace(SESSION, layers=(first, well, well, last)))
    assert comments(text) == comments(COMMENTED)


def test_the_comment_of_a_key_that_goes_stays() -> None:
    thin = replace(SESSION.layers[0], thickness_nm=None, thickness_ml=7.0)
    text = write_session(replace(SESSION, layers=(thin, *SESSION.layers[1:])), COMMENTED)
    assert "# thin" in text
    assert "thickness_nm = 2.0" not in text


def test_tables_come_and_go() -> None:
    mine = MaterialEntry("Own stuff", 0.2, 0.08)
    session = replace(
        SESSION, materials=(mine,), view=View(from_eV=0.1, to_eV=0.2), growth=Growth("InP")
    )
    text = written(session)
    assert comments(text) == comments(COMMENTED)
    assert written(SESSION, text).count("[material") == 0
    assert "substrate" not in written(SESSION, text)


INLINE = """\
format = 1  # a comment
conditions.bias_V = 0.1
left = { edge_eV = 0, mass = 0.067 }
right = { edge_eV = 0, mass = 0.067 }
layer = [ # all in one
  { edge_eV = 0.3, mass = 0.09, thickness_nm = 2.0 },
]
"""


def test_other_layouts_lose_no_comment() -> None:
    session = read_session(INLINE, "i")
    assert written(session, INLINE) == INLINE
    text = written(replace(session, title="x"), INLINE)
    assert "# a comment" in text
    changed = replace(session, layers=(session.layers[0], session.layers[0]))
    assert "# a comment" in written(changed, INLINE)


def test_windows_line_ends() -> None:
    text = COMMENTED.replace("\n", "\r\n")
    session = replace(SESSION, title="new")
    assert comments(written(session, text)) == comments(COMMENTED)


words = st.text(st.characters(exclude_categories=["C", "Z"]), max_size=12)
numbers = st.floats(0.02, 50.0)
maybe = st.none() | numbers
gaps = st.none() | st.floats(0.1, 10.0)
share = st.none() | st.floats(0.0, 1.0)
layer = st.builds(
    LayerEntry,
    label=words,
    edge_eV=numbers,
    mass=numbers,
    thickness_nm=numbers,
    donors_cm3=st.sampled_from([0.0, 1e17, 123456789.5]),
    permittivity=st.none() | st.floats(1.0, 20.0),
    to_edge_eV=maybe,
    gap_eV=gaps,
    to_gap_eV=gaps,
)
contact = st.builds(ContactEntry, edge_eV=numbers, mass=numbers, fermi_eV=maybe, gap_eV=gaps)
own = st.builds(MaterialEntry, name=words.filter(bool), edge_eV=numbers, mass=numbers, gap_eV=gaps)
lines = st.lists(words, max_size=3).map("\n".join)
session = st.builds(
    Session,
    title=words,
    notes=lines,
    conditions=st.builds(
        Conditions,
        temperature_K=numbers,
        bias_V=numbers,
        band=st.sampled_from(["parabolic", "kane"]),
        dephasing_eV=share,
    ),
    left=contact,
    layers=st.lists(layer, min_size=1, max_size=5).map(tuple),
    right=contact,
    materials=st.lists(own, max_size=2, unique_by=lambda entry: entry.name).map(tuple),
    growth=st.builds(Growth, substrate=st.none() | words),
    view=st.builds(View, from_eV=st.none() | st.floats(-1.0, 0.0), to_eV=maybe),
)


@settings(max_examples=150, deadline=None)
@given(session)
def test_round_trip_of_any_session(any_session: Session) -> None:
    assert read_session(write_session(any_session), "x") == any_session


@settings(max_examples=100, deadline=None)
@given(session)
def test_any_session_can_be_written_over_a_commented_text(any_session: Session) -> None:
    text = write_session(any_session, COMMENTED)
    assert read_session(text, "x") == any_session
    assert "# the head" in text


def test_save(tmp_path: Path) -> None:
    path = tmp_path / "a.toml"
    save(path, COMMENTED)
    assert path.read_text(encoding="utf-8") == COMMENTED
    path.chmod(0o640)
    save(path, "x = 1\n")
    assert stat.S_IMODE(path.stat().st_mode) == 0o640
    assert os.listdir(tmp_path) == ["a.toml"]


def test_save_follows_a_link(tmp_path: Path) -> None:
    target, link = tmp_path / "target.toml", tmp_path / "link.toml"
    target.write_text("old")
    link.symlink_to(target)
    save(link, "new")
    assert link.is_symlink()
    assert target.read_text() == "new"


@pytest.mark.parametrize("step", ["fsync", "replace"])
def test_a_save_that_breaks_off_leaves_the_old_file(
    tmp_path: Path, monkeypatch: pytest.MonkeyPatch, step: str
) -> None:
    path = tmp_path / "a.toml"
    path.write_text("old")

    def full(*_: object) -> None:
        raise OSError(28, "No space left on device")

    monkeypatch.setattr(saving.os if step == "fsync" else Path, step, full)
    with pytest.raises(SessionError, match="no space left on device; nothing was changed"):
        save(path, "new")
    assert path.read_text() == "old"
    assert os.listdir(tmp_path) == ["a.toml"]


def test_places_where_nothing_can_be_saved(tmp_path: Path) -> None:
    with pytest.raises(SessionError, match="it is a folder"):
        save(tmp_path, "x")
    with pytest.raises(SessionError, match="cannot be written"):
        save(tmp_path / "absent" / "a.toml", "x")
