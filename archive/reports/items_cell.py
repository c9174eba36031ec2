"""Checklist items R01 to R16: cells and substrates."""

from __future__ import annotations

from collections.abc import Callable, Iterator

from archive.reports.checklist import Item, Said, absence, sentence
from archive.reports.numbers import shown
from archive.reports.prose import article
from archive.reports.scope import Scope
from schemas.cell import Cell, TorsionalOscillator
from schemas.quantity import Quantity
from schemas.substrate import Substrate

__all__ = ["CELL_ITEMS"]


def plain(quantity: Quantity | None, *, setting: bool = False) -> str:
    """Return a quantity as plain text in its own unit."""
    return shown(quantity, setting=setting).plain


def _each_cell(item: str, says: Callable[[Cell], str | None]) -> Callable[[Scope], Iterator[Said]]:
    def over(scope: Scope) -> Iterator[Said]:
        for cell in scope.cells:
            text = says(cell)
            yield (
                sentence(text, cell.address)
                if text
                else absence(f"{item} of cell {cell.address}", cell.address)
            )

    return over


def _each_oscillator(
    item: str, says: Callable[[Scope, TorsionalOscillator], str | None]
) -> Callable[[Scope], Iterator[Said]]:
    def over(scope: Scope) -> Iterator[Said]:
        for cell in scope.cells:
            if isinstance(cell, TorsionalOscillator):
                text = says(scope, cell)
                yield (
                    sentence(text, cell.address)
                    if text
                    else absence(f"{item} of cell {cell.address}", cell.address)
                )

    return over


def _each_substrate(item: str, says: Callable[[Substrate], str | None]) -> Callable[[Scope], Iterator[Said]]:
    def over(scope: Scope) -> Iterator[Said]:
        for substrate in scope.substrates:
            text = says(substrate)
            yield (
                sentence(text, substrate.address)
                if text
                else absence(f"{item} of {substrate.address}", substrate.address)
            )

    return over


def _shape(cell: Cell) -> str | None:
    if not (cell.shape and cell.material and cell.seal):
        return None
    return f"The cell, revision {cell.address}, is {article(cell.shape)} {cell.shape} of {cell.material}, sealed by {cell.seal}."


def _volume(cell: Cell) -> str | None:
    return (
        None
        if cell.free_volume is None
        else f"Its open volume ({cell.address}) is {plain(cell.free_volume)}."
    )


def _rod(_: Scope, cell: TorsionalOscillator) -> str | None:
    return (
        f"The bob of {cell.address} hangs on a rod of {cell.rod_material}: {cell.rod}." if cell.rod else None
    )


def _mode(scope: Scope, cell: TorsionalOscillator) -> str | None:
    measured = [
        each
        for _, each in scope.output("empty_period")
        if _.plan.name == "empty-cell" and scope.cell_of(_) == cell.address
    ]
    if cell.empty_period is None and not measured:
        return None
    period = scope.text(measured[-1]) if measured else plain(cell.empty_period)
    return f"With the cell {cell.address} empty the period is {period}; {cell.mode or 'other modes are not recorded'}."


def _quality(scope: Scope, cell: TorsionalOscillator) -> str | None:
    found = [
        (reduction, each)
        for reduction, each in scope.output("quality_factor", "empty_quality_factor")
        if scope.cell_of(reduction) == cell.address
    ]
    if found:
        reduction, each = found[0]
        return f"Q of {cell.address} is {scope.text(each)}, from {reduction.plan.title.lower()} of {reduction.sweep}."
    return (
        None
        if cell.empty_quality_factor is None
        else f"Q of {cell.address} empty is {plain(cell.empty_quality_factor)}."
    )


def _inertia(_: Scope, cell: TorsionalOscillator) -> str | None:
    parts = [
        f"{name} is {plain(value)}"
        for name, value in (
            ("the moment of inertia", cell.inertia),
            ("the torsion constant", cell.torsion_constant),
        )
        if value is not None
    ]
    return f"For {cell.address} {' and '.join(parts)}." if parts else None


def _electrodes(scope: Scope) -> Iterator[Said]:
    for held in scope.runs:
        detection, name = held.sheet.detection, held.sheet.name
        if detection is None or detection.bias is None:
            yield absence(f"electrodes and bias in {name}", name)
            continue
        yield sentence(
            f"In {name} drive and detection were biased at {plain(detection.bias, setting=True)}; the torque varies as drive to the power "
            f"{detection.torque_exponent} and the signal as frequency to the power {detection.signal_exponent}.",
            name,
        )


def _substrate(each: Substrate) -> str | None:
    if each.mass is None or each.form is None:
        return None
    text = f"The substrate {each.address} is {plain(each.mass)} of {each.material} ({each.form})"
    return (
        f"{text}, outgassed: {each.outgassing}."
        if each.outgassing
        else f"{text}; outgassing is not recorded."
    )


def _area(each: Substrate) -> str | None:
    if each.area is None and each.specific_area is None:
        return None
    return f"The area of {each.address}, {plain(each.area or each.specific_area)}, follows from {each.area_method or 'a method that is not recorded'}."


def _pores(each: Substrate) -> str | None:
    if each.pore_diameter is None:
        return None
    porosity = f" and porosity {plain(each.porosity)}" if each.porosity is not None else ""
    return f"Pore diameter {plain(each.pore_diameter)}{porosity} are recorded of {each.address}."


def _preplating(each: Substrate) -> str | None:
    return f"Preplating of {each.address}: {each.preplating}." if each.preplating else None


CELL_ITEMS: tuple[Item, ...] = (
    Item("R01", "shape, material and seal", (), "cells", _each_cell("shape, material and seal", _shape)),
    Item("R02", "open volume", (), "cells", _each_cell("the open volume", _volume)),
    Item("R03", "the torsion rod", ("TO",), "cells", _each_oscillator("the torsion rod", _rod)),
    Item("R04", "modes and empty period", ("TO",), "cells", _each_oscillator("modes and empty period", _mode)),
    Item("R05", "Q", ("TO",), "cells", _each_oscillator("Q", _quality)),
    Item("R06", "inertia and torsion constant", ("TO",), "cells", _each_oscillator("inertia and torsion constant", _inertia)),
    Item("R07", "electrodes and bias", ("TO", "FS"), "cells", _electrodes),
    Item("R13", "mass and form of the substrate", ("FS", "PG", "TO", "TS", "HC"), "cells", _each_substrate("mass and form", _substrate)),
    Item("R14", "the area", ("FS", "PG", "TO", "TS", "HC"), "cells", _each_substrate("the area", _area)),
    Item("R15", "pore size", ("PG",), "cells", _each_substrate("pore size", _pores)),
    Item("R16", "preplating", ("FS", "PG", "TO"), "cells", _each_substrate("preplating", _preplating)),
)  # fmt: skip
