"""Session texts laid out in every way that TOML permits: nothing of them is lost by an edit."""

from __future__ import annotations

import random
import re
from collections.abc import Callable
from dataclasses import replace

import pytest

from tui.session.model import Growth, LayerEntry, MaterialEntry, Session, View
from tui.session.origin import sources
from tui.session.read import read_session
from tui.session.write import write_session

TEXTS = 250
CONTACT = {"edge_eV": 0.0, "mass": 0.067}
NOTES = (
    'notes = """\n# not a comment\n[left]\n# bar"""\n',
    "notes = '''\n[[layer]]\n#x'''  # behind\n",
    'notes = """a\\\n  b # c"""\n',
)
COMMENT = re.compile(
    r'''"""(?:\\.|(?!""").)*"{3,5}|"(?:\\.|[^"\\\n])*"'''
    r"""|'''(?:(?!''').)*'{3,5}|'[^'\n]*'|(\#[^\n\r]*)""",
    re.DOTALL,
)
Values = dict[str, float | str]


def comments(text: str) -> set[str]:
    return {found[1].strip() for found in COMMENT.finditer(text) if found[1]}


class Scribe:
    """Writes one design in a layout of its own; every comment is unique."""

    def __init__(self, seed: int) -> None:
        self.chance = random.Random(seed)  # noqa: S311
        self.count = 0

    def pick(self, *choices: str) -> str:
        return self.chance.choice(choices)

    def comment(self) -> str:
        self.count += 1
        return self.pick(
            "",
            f"  # c{self.count}",
            f'  # """ q{self.count}',
            f"\t#'{self.count}",
            f" #[[{self.count}]]",
        )

    def lead(self) -> str:
        self.count += 1
        return self.pick("", "", "\n", f"# l{self.count}\n", f"\n# a{self.count}\n\n# b\n", "  ")

    def key(self, name: str) -> str:
        return self.pick(name, name, f'"{name}"', f"'{name}'")

    def value(self, value: float | str) -> str:
        if isinstance(value, str):
            return self.pick(f'"{value}"', f"'{value}'", f'"""{value}"""', f"'''{value}'''")
        return self.pick(repr(value), f"+{value}", f"{value:.6e}")

    def lines(self, values: Values) -> str:
        names = list(values)
        self.chance.shuffle(names)
        return "".join(
            f"{self.lead()}{self.key(name)}{self.pick(' = ', '=', '  =   ')}"
            f"{self.value(values[name])}{self.comment()}\n"
            for name in names
        )

    def inline(self, values: Values) -> str:
        pairs = (f"{self.key(name)} = {self.value(value)}" for name, value in values.items())
        return "{ " + ", ".join(pairs) + " }"

    def layers(self) -> list[Values]:
        result: list[Values] = []
        for _ in range(self.chance.randrange(1, 5)):
            edge, thickness = self.chance.randrange(100) / 100, self.chance.randrange(1, 900) / 100
            layer: Values = {"edge_eV": edge, "mass": 0.09, "thickness_nm": thickness}
            if self.chance.random() < 0.3:
                layer["label"] = self.pick("a", "# no", "[x]", "b c")
            result.append(layer)
        return result

    def text(self) -> str:
        top, parts = f"format = 1{self.comment()}\n" + self.pick("", *NOTES), []
        style = self.pick("inline", "dotted", "array", "apart", "plain")
        if style == "inline":
            top += f"left = {self.inline(CONTACT)}{self.comment()}\n"
        elif style == "dotted":
            top += "".join(
                f"left.{self.key(k)} = {v}{self.comment()}\n" for k, v in CONTACT.items()
            )
        else:
            parts.append(f"{self.lead()}{self.pick('[left]', '[ left ]')}\n{self.lines(CONTACT)}")
        stated = self.layers()
        header = self.pick("[[layer]]", "[[ layer ]]")
        tables = [f"{self.lead()}{header}{self.comment()}\n{self.lines(one)}" for one in stated]
        if style == "array":
            top += "layer = [\n" + ",\n".join(self.inline(one) for one in stated) + "\n]\n"
            tables = []
        late = tables[1:] if style == "apart" else []
        parts += tables[: len(tables) - len(late)]
        parts.append(f"{self.lead()}[right]\n{self.lines(CONTACT)}")
        parts += late
        own: Values = {"edge_eV": 0.2, "mass": 0.08}
        parts.append(self.pick("", f"[material.Mine]{self.comment()}\n{self.lines(own)}"))
        text = top + "".join(parts) + self.pick("", "# the end", "\n# the end\n")
        return text if self.chance.random() < 0.8 else text.replace("\n", "\r\n")


def edit(session: Session, chance: random.Random) -> Session:
    """Change something, but let no layer go."""
    layers = list(session.layers)
    at = chance.randrange(len(layers))
    fresh = LayerEntry(edge_eV=0.95, mass=0.1, thickness_nm=1.0)
    one = layers[at]
    edits: list[Callable[[], Session]] = [
        lambda: replace(session, title="new", notes='x\t"""y\\\nz'),
        lambda: replace(session, conditions=replace(session.conditions, bias_V=0.25)),
        lambda: replace(session, left=replace(session.left, fermi_eV=0.05)),
        lambda: replace(session, right=replace(session.right, edge_eV=None, material="AlAs")),
        lambda: replace(session, growth=Growth("InP")),
        lambda: replace(session, view=View(0.0, 1.0, 0.2)),
        lambda: replace(
            session,
            materials=(
                *(m for m in session.materials if m.name != "Z z"),
                MaterialEntry("Z z", 0.1, 0.1),
            ),
        ),
        lambda: replace(session, layers=(*layers[:at], fresh, *layers[at:])),
        lambda: replace(session, layers=(*layers[:at], one, *layers[at:])),
        lambda: replace(session, layers=tuple(chance.sample(layers, len(layers)))),
        lambda: replace(
            session,
            layers=(*layers[:at], replace(one, thickness_nm=9.5, label='né"'), *layers[at + 1 :]),
        ),
    ]
    return chance.choice(edits)()


@pytest.mark.parametrize("seed", range(4))
def test_no_layout_loses_a_comment_or_changes_by_itself(seed: int) -> None:
    for number in range(TEXTS):
        scribe = Scribe(1000 * seed + number)
        text = scribe.text()
        session = read_session(text, "x")
        assert write_session(session, text) == text
        changed = edit(edit(session, scribe.chance), scribe.chance)
        written = write_session(changed, text)
        assert read_session(written, "y") == changed
        assert comments(text) <= comments(written), text


LIST = """\
format = 1  # one
left = { edge_eV = 0, mass = 0.067 }  # two
right.edge_eV = 0  # three
right.mass = 6.7e-2
layer = [
  { edge_eV = 0.3, mass = 0.09, thickness_nm = 2.0 },  # four
  { edge_eV = 0.0, mass = 0.09, thickness_nm = 5.0 },
]
"""


def test_values_change_where_they_stand_in_a_list_of_inline_tables() -> None:
    session = read_session(LIST, "x")
    first, second = session.layers
    changed = replace(
        session,
        layers=(replace(first, thickness_nm=2.5), second),
        right=replace(session.right, mass=0.07),
        conditions=replace(session.conditions, bias_V=0.1),
    )
    expected = LIST.replace("thickness_nm = 2.0", "thickness_nm = 2.5").replace("6.7e-2", "0.07")
    written = write_session(changed, LIST)
    assert written.startswith(expected)
    assert "[conditions]" in written[len(expected) :]
    assert read_session(written, "y") == changed


def layer(edge: float, thickness: float, label: str = "") -> LayerEntry:
    return LayerEntry(label=label, edge_eV=edge, mass=0.07, thickness_nm=thickness)


A, B, C, D = layer(0.3, 2.0), layer(0.0, 5.0, "well"), layer(0.3, 2.5), layer(0.1, 9.0)


@pytest.mark.parametrize(
    ("after", "expected"),
    [
        ((A, B, C, D), [0, 1, 2, 3]),
        ((A, B, D), [0, 1, 3]),
        ((B, A, C, D), [1, 0, 2, 3]),
        ((A, A, B, C, D), [0, None, 1, 2, 3]),
        ((layer(0.3, 2.1), B, C, D), [0, 1, 2, 3]),
        ((A, C, D, layer(0.0, 6.0, "well")), [0, 2, 3, 1]),  # moved and edited
        ((A, layer(-5.0, 1.0, "new"), B, C, D), [0, None, 1, 2, 3]),
        ((D,), [3]),
    ],
)
def test_where_layers_came_from(after: tuple[LayerEntry, ...], expected: list[int | None]) -> None:
    assert sources((A, B, C, D), after) == expected


def test_long_stacks_are_matched_too() -> None:
    before = [layer(0.3 * (n % 2), 2.0) for n in range(4000)]
    after = [replace(one, thickness_nm=3.0) for one in before]
    assert sources(before, after) == list(range(4000))
    after = [*before[:10], *before[12:3000], A, *before[3000:]]
    assert len([source for source in sources(before, after) if source is None]) <= 1


NAMES = ['a\\"b', "x.y", "# c", "[z]", "b\\\\", "é = 1", "\\u00fc"]


@pytest.mark.parametrize("name", NAMES)
def test_materials_of_any_name_stay_whole_beside_a_layer_that_goes(name: str) -> None:
    own = f'# of {len(name)}\n[material."{name}"]   # own\nmass = 0.1\nedge_eV = 2e-1\n'
    one = "# one\n[[layer]]\nedge_eV = 0.3\nmass = 0.09\nthickness_nm = 2.0\n"
    two = one.replace("one", "two").replace("2.0", "4.0")
    ends = "[left]\nedge_eV = 0\nmass = 1\n[right]\nedge_eV = 0\nmass = 1\n"
    text = "format = 1\n" + ends + one + own + two
    session = read_session(text, "x")
    assert write_session(session, text) == text
    first, second = session.layers
    left_over = write_session(replace(session, layers=(second,)), text)
    assert left_over == "format = 1\n" + ends + two + own
    turned = write_session(replace(session, layers=(second, first)), text)
    assert turned == "format = 1\n" + ends + two + own + one
    heavier = replace(session, materials=(replace(session.materials[0], mass=0.2),))
    assert write_session(heavier, text) == text.replace("mass = 0.1", "mass = 0.2")


@pytest.mark.parametrize("seed", range(60))
def test_mixed_line_ends(seed: int) -> None:
    """As two editors in turn leave them: what does not change keeps its own."""
    scribe = Scribe(seed)
    lines = scribe.text().replace("\r\n", "\n").splitlines(keepends=True)
    text = "".join(line.replace("\n", scribe.pick("\n", "\r\n")) for line in lines)
    session = read_session(text, "x")
    assert write_session(session, text) == text
    changed = edit(session, scribe.chance)
    written = write_session(changed, text)
    assert read_session(written, "y") == changed
    assert comments(text) <= comments(written)
