"""The embedded demo design; its scenario is invented."""

from __future__ import annotations

from pathlib import Path

DEMO_NAME = "kestrel-7"


def demo_text() -> str:
    """Give the session text of the demo design."""
    return (Path(__file__).parent / "demo.toml").read_text(encoding="utf-8")
