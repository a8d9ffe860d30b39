"""``winze iv``: the contract's keys, columns, features and refusals."""

import json
from pathlib import Path

import numpy as np
import pytest

from tui.command.entry import main
from tui.session.demo import demo_text


@pytest.fixture
def design(tmp_path: Path) -> str:
    path = tmp_path / "design.toml"
    path.write_text(demo_text(), encoding="utf-8")
    return str(path)


def result(capsys: pytest.CaptureFixture[str], *arguments: str) -> dict[str, object]:
    assert main(["iv", *arguments, "--json"]) == 0
    found: dict[str, object] = json.loads(capsys.readouterr().out)
    return found


def test_table(capsys: pytest.CaptureFixture[str], design: str) -> None:
    assert main(["iv", design, "--from", "-0.1", "--to", "0.2", "--points", "7"]) == 0
    said = capsys.readouterr()
    lines = said.out.splitlines()
    assert lines[0].startswith("bias_V,current_density_A_per_cm2,error_A_per_cm2,conductance_S")
    assert [float(line.split(",")[0]) for line in lines[1:]] == [
        -0.1,
        -0.05,
        0.0,
        0.05,
        0.1,
        0.15,
        0.2,
    ]
    assert lines[3].split(",")[1] == "0.0"
    assert "winze: peak " in said.err
    assert "peak" not in said.out


def test_features(capsys: pytest.CaptureFixture[str], design: str) -> None:
    found = result(capsys, design, "--from", "0", "--to", "0.3")
    peak, valley = found["peak"], found["valley"]
    assert isinstance(peak, dict)
    assert isinstance(valley, dict)
    assert 0.09 < peak["bias_V"] < 0.13
    assert found["peak_to_valley"] == pytest.approx(
        peak["current_density_A_per_cm2"] / valley["current_density_A_per_cm2"]
    )
    current = np.array(found["current_density_A_per_cm2"])
    assert current.max() <= peak["current_density_A_per_cm2"] * (1.0 + 1e-9)


def test_the_peak_does_not_depend_on_the_grid(
    capsys: pytest.CaptureFixture[str], design: str
) -> None:
    peaks = [
        result(capsys, design, "--to", "0.3", *more)["peak"]
        for more in ([], ["--points", "31"], ["--points", "61"])
    ]
    places = [peak["bias_V"] for peak in peaks if isinstance(peak, dict)]
    assert places == pytest.approx([places[0]] * 3, abs=1e-5)


def test_shares_make_the_whole(capsys: pytest.CaptureFixture[str], design: str) -> None:
    found = result(capsys, design, "--to", "0.3", "--points", "13")
    levels = found["levels"]
    assert isinstance(levels, list)
    share = np.array([level["share"] for level in levels], dtype=float)
    # The demo's current goes through its levels at every bias but zero, where there is none.
    assert np.nansum(share[:, 1:], axis=0) == pytest.approx(1.0, rel=1e-9)


def test_mirror(capsys: pytest.CaptureFixture[str], design: str) -> None:
    found = result(capsys, design, "--from", "-0.2", "--to", "0.2", "--points", "9")
    current = np.array(found["current_density_A_per_cm2"])
    assert current == pytest.approx(-current[::-1], rel=1e-7)


def test_a_mesa_gives_a_cut_off(capsys: pytest.CaptureFixture[str], tmp_path: Path) -> None:
    path = tmp_path / "mesa.toml"
    mesa = "\n[device]\nmesa_um2 = 2.0\nseries_ohm = 5.0\nparallel_fF = 1.0\n"
    path.write_text(demo_text() + mesa, encoding="utf-8")
    figures = result(capsys, str(path))["figures"]
    assert isinstance(figures, dict)
    assert figures["cutoff_Hz"] > 1e9
    assert figures["peak_current_A"] == pytest.approx(figures["peak_mA_per_um2"] * 2e-3)


def test_the_sweep_of_the_session(capsys: pytest.CaptureFixture[str], tmp_path: Path) -> None:
    path = tmp_path / "swept.toml"
    path.write_text(demo_text() + "\n[sweep]\nfrom_V = -0.05\nto_V = 0.05\n", encoding="utf-8")
    biases = result(capsys, str(path))["bias_V"]
    assert isinstance(biases, list)
    assert (biases[0], biases[-1]) == (-0.05, 0.05)


@pytest.mark.parametrize(
    ("arguments", "words"),
    [
        (["--bias", "0.1"], "use --from and --to instead of --bias"),
        (["--from", "0.2", "--to", "0.1"], "from 0.2 to 0.1 V is empty"),
        (["--points", "0"], "a whole number from 1 to"),
        (["--to", "1000"], "a bias lies between -50 and 50 V"),
    ],
)
def test_refusals(
    arguments: list[str], words: str, capsys: pytest.CaptureFixture[str], design: str
) -> None:
    assert main(["iv", design, *arguments]) == 2
    assert words in capsys.readouterr().err


@pytest.mark.parametrize(
    ("table", "words"),
    [
        ("[sweep]\nfrom_V = 0.3\nto_V = 0.2\n", "a sweep has from_V below to_V"),
        ('[sweep]\noverlay_K = "77 cold"\n', 'write it as "77 4.2"'),
        ("[device]\nmesa = 2.0\n", "write mesa_um2"),
        ("[device]\nseries_ohm = -1.0\n", "a series resistance lies between"),
    ],
)
def test_refused_tables(
    table: str, words: str, capsys: pytest.CaptureFixture[str], tmp_path: Path
) -> None:
    path = tmp_path / "bad.toml"
    path.write_text(f"{demo_text()}\n{table}", encoding="utf-8")
    assert main(["iv", str(path)]) == 2
    assert words in capsys.readouterr().err


def test_unlike_masses_and_strain_are_said(
    capsys: pytest.CaptureFixture[str], tmp_path: Path
) -> None:
    path = tmp_path / "unlike.toml"
    text = demo_text().replace('material   = "GaAs"', 'material = "GaAs"')
    head, _, tail = text.rpartition('material = "GaAs"')
    unlike = f'{head}material = "In0.3Ga0.7As"{tail}' + '\n[growth]\nsubstrate = "GaAs"\n'
    path.write_text(unlike, encoding="utf-8")
    found = result(capsys, str(path), "--to", "0.1", "--points", "3")
    notes = found["notes"]
    assert isinstance(notes, list)
    assert any(note.startswith("mass: in the plane") for note in notes)
    assert any(note.startswith("strain: ") for note in notes)


def test_no_electrons(capsys: pytest.CaptureFixture[str], tmp_path: Path) -> None:
    path = tmp_path / "bare.toml"
    path.write_text(demo_text().replace("donors_cm3 = 2e17", ""), encoding="utf-8")
    assert main(["iv", str(path)]) == 2
    assert "state donors_cm3 or fermi_eV of both contacts" in capsys.readouterr().err
