"""Lines of keys and tables, in texts that try to mislead."""

from __future__ import annotations

import pytest

from tui.session.lines import KeyPath, bare, line_of

TEXT = '''\
format = 1  # """ no string begins here
notes = """
[left]
mass = 1
# no comment"""  # but this is one
title = 'a # b'
left.mass = 0.067

# [[layer]] is not one
[[ layer ]]   # the first
"mass" = 0.09
[[layer]]
label = "[[layer]]"
mass = 0.1

[ material . "My own" ]
edge_eV = 0.2
[right]
edge_eV = 0.0
'''


@pytest.mark.parametrize(
    ("path", "line"),
    [
        (("format",), 1),
        (("notes",), 2),
        (("title",), 6),
        (("left", "mass"), 7),
        (("layer", 0), 10),
        (("layer", 0, "mass"), 11),
        (("layer", 1), 12),
        (("layer", 1, "mass"), 14),
        (("layer", 1, "absent"), 12),
        (("material", "My own", "edge_eV"), 17),
        (("right", "edge_eV"), 19),
        (("nowhere", "at all"), None),
        ((), None),
    ],
)
def test_lines(path: KeyPath, line: int | None) -> None:
    assert line_of(TEXT, path) == line


def test_bare_keeps_every_line_where_it_is() -> None:
    blanked = bare(TEXT)
    assert blanked.count("\n") == TEXT.count("\n")
    assert "no comment" not in blanked
    assert "'a # b'" in blanked
