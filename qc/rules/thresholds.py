"""Thresholds: numbers with unit, source and how well that source is known."""

import tomllib
from collections.abc import Mapping
from functools import cache
from pathlib import Path
from typing import Any

MARKS = ("READ", "MEM", "DEF")
Parameters = Mapping[str, Mapping[str, Any]]


@cache
def defaults() -> dict[str, dict[str, dict[str, Any]]]:
    """Rule -> parameter -> {value, unit, source, mark}, as thresholds.toml has them."""
    return tomllib.loads((Path(__file__).parent / "thresholds.toml").read_text(encoding="utf-8"))


def values(parameters: Parameters) -> dict[str, float]:
    """Parameter -> number, as a rule's check takes them."""
    return {name: entry["value"] for name, entry in parameters.items()}


def in_words(mark: str, source: str) -> str:
    """Where a number is from, said so that nobody takes a memory for a quotation."""
    if mark == "READ":
        return source
    if mark == "MEM":
        return f"from memory of {source}"
    return f"our default, no publication ({source})"


def differs(parameters: Parameters, rule: str) -> list[str]:
    """Names of the rule's parameters that do not have their shipped value."""
    shipped = defaults().get(rule, {})
    return [name for name, entry in parameters.items() if entry["value"] != shipped.get(name, {}).get("value")]
