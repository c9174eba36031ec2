"""Lines of the universal jump for the cells of an archive: coverage above the inert layer against temperature."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from functools import lru_cache

from archive.index import CellUse, Index, ResultRow
from archive.lab.curves.kept import Kept
from archive.physics.film_static import onset_coverage
from archive.reports.plane_view import Line

__all__ = ["NO_CELL", "cell_name", "cell_uses", "inert_layers", "universal_lines"]

NO_CELL = "no cell"

# Both are read where all of the film above the inert layer flows, far below its transition: the inert layer itself.
_INERT = "onset_coverage"
# The coverage at which a film of this temperature becomes superfluid: more than the inert layer by the jump.
_ONSET = "transition_coverage"


@lru_cache(maxsize=4096)
def cell_name(address: str | None) -> str:
    """Name of a cell, whatever its revision.

    Examples
    --------
    >>> cell_name("TO-4.r2"), cell_name(None)
    ('TO-4', 'no cell')
    """
    if address is None:
        return NO_CELL
    return address.rpartition(".r")[0] or address


# A few hundred bytes each; to find them, every sweep is looked at.
_USES: Kept[list[CellUse]] = Kept(most=2**22, size=lambda uses: 2**8 * (1 + len(uses)))


def cell_uses(index: Index) -> list[CellUse]:
    """Every pair of cell and substrate that a sweep names; kept until a file comes in."""
    return _USES.get(index.stamp(), index.cells_and_substrates)


def inert_layers(index: Index) -> dict[str, Line]:
    """Inert layer of each cell of which a current reduction found one, the last by address, as the line that begins there.

    Notes
    -----
    From a dose run or a persistent current it is the coverage itself at which all of the film begins to flow; from third sound it is
    the coverage of the transition less that of the universal jump at the temperature of the sweep.
    """
    found: dict[str, Line] = {}
    for name in (_ONSET, _INERT):
        for row in sorted(index.results(name=name), key=lambda each: each.reduction):
            value = None if row.quantity != "coverage" else row.value_si
            inert = value if value is None or name == _INERT else _less_jump(index, row, value)
            if inert is not None and inert >= 0:
                cell = cell_name(row.cell)
                found[cell] = Line(cell, None, inert, row.uncertainty_si, f"{row.reduction}#{row.name}")
    return found


def _less_jump(index: Index, row: ResultRow, value: float) -> float | None:
    sweep = index.sweep(row.sweep)
    ends = () if sweep is None else (sweep.temperature_low, sweep.temperature_high)
    known = [end for end in ends if end is not None]
    if not known:
        return None
    return value - float(onset_coverage(sum(known) / len(known), inert_coverage=0.0))


def universal_lines(
    index: Index, films: Mapping[str, str | None], inert: Mapping[str, Line], looks: Mapping[str, int]
) -> tuple[tuple[Line, ...], tuple[str, ...]]:
    """Return the lines for some cells with films, and the cells that get none because their films are in pores.

    Parameters
    ----------
    index : Index
    films : mapping
        Cells by name, with the address of their substrate.
    inert : mapping
        From `inert_layers`.
    looks : mapping
        Look of each cell.

    Notes
    -----
    Cells of which no inert layer is known share one line that begins at zero. The line is that of a thin flat film: coverage of the
    inert layer plus the universal jump, no more (D. R. Nelson, J. M. Kosterlitz, Physical Review Letters 39, 1201 (1977)); depletion by
    thermal excitations is not in it. A film that covers the walls of pores has no jump, so its cell gets no line.
    """
    porous = _porous(index, [each for each in set(films.values()) if each is not None])
    in_pores = tuple(sorted(cell for cell, substrate in films.items() if substrate in porous))
    flat = [cell for cell in sorted(films) if cell not in in_pores and cell != NO_CELL]
    lines = [
        Line(cell, looks[cell], inert[cell].inert, inert[cell].inert_uncertainty, inert[cell].source)
        for cell in flat
        if cell in inert
    ]
    others = [cell for cell in flat if cell not in inert]
    if others:
        lines.append(Line(", ".join(others), None, 0.0, None, None))
    return tuple(lines), in_pores


def _porous(index: Index, substrates: Sequence[str]) -> frozenset[str]:
    """Addresses of those substrates whose record states pores."""
    contents = index.record_contents(sorted(substrates))
    return frozenset(
        address
        for address, content in contents.items()
        if content.get("pore_diameter") is not None or content.get("porosity") is not None
    )
