"""Layers of helium: a coverage only by the definition that a substrate carries."""

from __future__ import annotations

from dataclasses import dataclass
from typing import TYPE_CHECKING, Final

if TYPE_CHECKING:
    from schemas.quantity import Quantity

__all__ = ["LAYER_WORDS", "Layer", "no_substrate"]

LAYER_WORDS: Final = frozenset({"layer", "layers"})


def no_substrate(field: str) -> str:
    """Sentence for layers without a substrate.

    Parameters
    ----------
    field : str
        Where the substrate is to be named, such as `--substrate NAME`.
    """
    return (
        f"a layer has no fixed size: it is what a substrate's record defines; name the substrate with {field}, "
        "or write the coverage in umol/m^2 or atoms/nm^2"
    )


@dataclass(frozen=True)
class Layer:
    """What one layer means on a substrate: its coverage, the definition in words, and the address of the record."""

    coverage: Quantity
    definition: str
    address: str
