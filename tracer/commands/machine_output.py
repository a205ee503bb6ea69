"""Figures for machines."""

import json
import math
from collections.abc import Mapping
from typing import Any

import typer


def print_json(figures: Mapping[str, Any]) -> None:
    """Print `figures` as one JSON object; what is no finite number becomes null, as JSON has no other word for it."""
    typer.echo(json_text(figures), nl=False)


def json_text(figures: Mapping[str, Any]) -> str:
    """Return `figures` as the text of one JSON object, see `print_json`."""
    return json.dumps(_plain(figures), indent=2, ensure_ascii=False) + "\n"


def _plain(value: Any) -> Any:
    if isinstance(value, Mapping):
        return {key: _plain(item) for key, item in value.items()}
    if hasattr(value, "_asdict"):
        return _plain(value._asdict())
    if isinstance(value, list | tuple):
        return [_plain(item) for item in value]
    if hasattr(value, "item"):
        value = value.item()
    if isinstance(value, float) and not math.isfinite(value):
        return None
    return value
