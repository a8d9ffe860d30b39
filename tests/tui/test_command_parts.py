"""Spectra too long to be held are written in parts: the same bytes, none held back."""

from __future__ import annotations

import itertools
from collections.abc import Iterator
from pathlib import Path

import numpy as np
import pytest

from physics import scattering
from physics.scattering import scatter
from tui.command.entry import main
from tui.report.objects import document, spectrum_object
from tui.report.tables import spectrum_table, spectrum_table_parts
from tui.session.demo import demo_text
from tui.session.read import read_session
from tui.session.save import save_parts
from tui.study import Request, set_scene

DEMO = read_session(demo_text(), "demo")
WINDOW = ["--from", "-0.02", "--to", "0.3", "--points", "17"]


@pytest.mark.parametrize("form", ["csv", "json"])
def test_the_bytes_are_those_of_one_piece(
    form: str, tmp_path: Path, monkeypatch: pytest.MonkeyPatch, capsys: pytest.CaptureFixture[str]
) -> None:
    monkeypatch.setattr(scattering, "ENERGIES_AT_ONCE", 5)
    whole = scatter(set_scene(Request(DEMO)).profile, np.linspace(-0.02, 0.3, 17))
    expected = spectrum_table(whole)
    if form == "json":
        expected = document("spectrum", DEMO, spectrum_object(whole))
        assert "null" in expected
    design, path = tmp_path / "design.toml", tmp_path / "result"
    design.write_text(demo_text(), encoding="utf-8")
    call = ["spectrum", str(design), *WINDOW, *(["--json"] if form == "json" else [])]
    assert main(call) == 0
    assert capsys.readouterr().out == expected
    assert main([*call, "-o", str(path)]) == 0
    assert path.read_text(encoding="utf-8") == expected


def test_no_part_waits_for_the_next() -> None:
    part = scatter(set_scene(Request(DEMO)).profile, np.array([0.1]))
    endless = spectrum_table_parts(itertools.repeat(part))
    assert next(endless).startswith("energy_eV,")
    assert next(endless) == next(endless)


def test_parts_that_end_too_soon_leave_the_file_as_it_was(tmp_path: Path) -> None:
    path = tmp_path / "result"
    path.write_text("before", encoding="utf-8")

    def short() -> Iterator[str]:
        yield "after"
        raise MemoryError

    with pytest.raises(MemoryError):
        save_parts(path, short())
    assert path.read_text(encoding="utf-8") == "before"
    assert list(tmp_path.iterdir()) == [path]
