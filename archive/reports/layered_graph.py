"""Directed graphs without cycles drawn as SVG in layers: boxes, and curves that pass between them.

The method is that of K. Sugiyama, S. Tagawa, M. Toda, "Methods for visual understanding of hierarchical system structures",
IEEE Transactions on Systems, Man, and Cybernetics 11, 109 (1981): layers by longest path, order by barycentres, then places.
The same graph gives the same bytes.
"""

from __future__ import annotations

from collections.abc import Callable, Iterable, Mapping, Sequence
from dataclasses import dataclass
from itertools import pairwise
from xml.sax.saxutils import escape, quoteattr

__all__ = ["Box", "drawn"]

_TEXT = 2.6  # mm: 7.4 pt
_LINE = 3.3
_CHARACTER = 0.57 * _TEXT  # mean advance of a sans-serif
_PAD = 1.4
_GAP = 3.0
_BETWEEN = 9.0
_ROUNDS = 12
_FONT = "Source Sans 3, Helvetica, Arial, sans-serif"
# Kinds differ by outline, so that they can be told apart in grey.
_OUTLINES = {
    "raw": 'stroke-width="0.7" rx="0"',
    "data": 'stroke-width="0.25" rx="0"',
    "record": 'stroke-width="0.25" stroke-dasharray="1.2 0.8" rx="0"',
    "act": 'stroke-width="0.25" rx="2"',
    "result": 'stroke-width="0.7" rx="2"',
}


@dataclass(frozen=True)
class Box:
    """One node.

    Parameters
    ----------
    key : str
        Its identity, e.g. an address.
    lines : tuple of str
        What stands in it.
    kind : str
        One of raw, data, record, act, result: the outline.
    """

    key: str
    lines: tuple[str, ...]
    kind: str = "data"

    @property
    def width(self) -> float:
        """Width in mm."""
        return max(map(len, self.lines)) * _CHARACTER + 2 * _PAD

    @property
    def height(self) -> float:
        """Height in mm."""
        return len(self.lines) * _LINE + 2 * _PAD - 0.6


def drawn(
    boxes: Iterable[Box],
    edges: Iterable[tuple[str, str]],
    *,
    title: str,
    downward: bool = True,
    link: Callable[[str], str | None] | None = None,
) -> str:
    """Return a graph as one ``<svg>`` element with sizes in millimetres.

    Parameters
    ----------
    boxes : iterable of Box
    edges : iterable of (str, str)
        Keys: what was used, what came of it.
    title : str
        What the graph shows, for readers who do not see it.
    downward : bool
        Whether what came later stands below; else to the right.
    link : callable, optional
        Address of a page for a key.

    Raises
    ------
    ValueError
        If the edges have a cycle, or name a box that is not there.
    """
    by_key = {box.key: box for box in boxes}
    wanted = sorted(set(edges))
    unknown = sorted({end for edge in wanted for end in edge} - set(by_key))
    if unknown:
        raise ValueError(f"edges: {unknown[0]!r} is no box")
    layers, chains = _layers(by_key, wanted)
    ordered = _ordered(layers, chains)
    size = {
        key: ((box.width, box.height) if downward else (box.height, box.width)) for key, box in by_key.items()
    }
    across = _places(ordered, chains, size)
    along: list[float] = []
    thick = [max((size[key][1] for key in layer if key in size), default=0.0) for layer in ordered]
    depth = 0.0
    for each in thick:
        along.append(depth + each / 2)
        depth += each + _BETWEEN
    level = {key: number for number, layer in enumerate(ordered) for key in layer}
    spot = {key: (across[key], along[level[key]]) for key in level}
    half = {key: size[key][0] / 2 if key in size else 0.4 for key in spot}
    low = min((spot[key][0] - half[key] for key in spot), default=0.0) - 1
    high = max((spot[key][0] + half[key] for key in spot), default=1.0) + 1
    deep = max(depth - _BETWEEN, 0.0) + 2

    def at(x: float, y: float) -> tuple[float, float]:
        return (x - low, y + 1) if downward else (y + 1, x - low)

    width, height = (high - low, deep) if downward else (deep, high - low)
    # A picture holds nothing that can be chosen; with links it is a group of them.
    role = "img" if link is None else "group"
    parts = [
        f'<svg xmlns="http://www.w3.org/2000/svg" role="{role}" width="{width:.1f}mm" height="{height:.1f}mm" '
        f'viewBox="0 0 {width:.1f} {height:.1f}"><title>{escape(title)}</title>',
        f'<g fill="none" stroke="currentColor" stroke-width="0.2" font-family="{_FONT}" font-size="{_TEXT}">',
    ]
    for (start, end), chain in sorted(chains.items()):
        # A line that passes a layer runs straight beside its boxes.
        passed = [
            (spot[key][0], spot[key][1] + side * thick[level[key]] / 2) for key in chain for side in (-1, 1)
        ]
        leave = (spot[start][0], spot[start][1] + size[start][1] / 2)
        enter = (spot[end][0], spot[end][1] - size[end][1] / 2)
        parts.append(_curve([at(*each) for each in (leave, *passed, enter)], downward=downward))
    parts += [
        _box(by_key[key], at(*spot[key]), None if link is None else link(key)) for key in sorted(by_key)
    ]
    return "".join([*parts, "</g></svg>"])


def _layers(
    boxes: Mapping[str, Box], edges: Sequence[tuple[str, str]]
) -> tuple[list[list[str]], dict[tuple[str, str], list[str]]]:
    """Layers of keys, and for each edge the keys of the empty places that it passes."""
    after: dict[str, list[str]] = {key: [] for key in boxes}
    before: dict[str, list[str]] = {key: [] for key in boxes}
    for start, end in edges:
        after[start].append(end)
        before[end].append(start)
    level: dict[str, int] = {}
    ready = sorted(key for key in boxes if not before[key])
    missing = {key: len(before[key]) for key in boxes}
    while ready:
        key = ready.pop()
        level[key] = max((level[each] + 1 for each in before[key]), default=0)
        for each in after[key]:
            missing[each] -= 1
            if not missing[each]:
                ready.append(each)
    if len(level) < len(boxes):
        raise ValueError("edges: they form a cycle")
    # What rests on nothing stands just before its first use.
    for key in boxes:
        if not before[key] and after[key]:
            level[key] = min(level[each] for each in after[key]) - 1
    layers: list[list[str]] = [[] for _ in range(max(level.values(), default=-1) + 1)]
    for key in sorted(level):
        layers[level[key]].append(key)
    chains: dict[tuple[str, str], list[str]] = {}
    for start, end in edges:
        # Edges from one box share the places that they pass, so that they run as one line until they part.
        chain = [f"\0{start}\0{number}" for number in range(level[start] + 1, level[end])]
        for number, key in enumerate(chain, level[start] + 1):
            if key not in layers[number]:
                layers[number].append(key)
        chains[start, end] = chain
    return layers, chains


def _neighbours(
    chains: Mapping[tuple[str, str], list[str]],
) -> tuple[dict[str, list[str]], dict[str, list[str]]]:
    up: dict[str, list[str]] = {}
    down: dict[str, list[str]] = {}
    for (start, end), chain in sorted(chains.items()):
        for one, two in pairwise([start, *chain, end]):
            if two not in down.setdefault(one, []):
                down[one].append(two)
                up.setdefault(two, []).append(one)
    return up, down


def _ordered(layers: list[list[str]], chains: Mapping[tuple[str, str], list[str]]) -> list[list[str]]:
    """Layers, each ordered by the mean place of its neighbours; the order with the fewest crossings is kept."""
    up, down = _neighbours(chains)
    current = [list(layer) for layer in layers]
    best, fewest = [list(layer) for layer in current], _crossings(current, down)
    for turn in range(_ROUNDS):
        forwards = turn % 2 == 0
        beside = up if forwards else down
        numbers = range(1, len(current)) if forwards else range(len(current) - 2, -1, -1)
        for number in numbers:
            other = {key: place for place, key in enumerate(current[number - 1 if forwards else number + 1])}
            own = {key: place for place, key in enumerate(current[number])}

            def middle(
                key: str, other: dict[str, int] = other, own: dict[str, int] = own
            ) -> tuple[float, int]:
                near = [other[each] for each in beside.get(key, ()) if each in other]  # noqa: B023 - used at once
                return (sum(near) / len(near) if near else float(own[key]), own[key])

            current[number].sort(key=middle)
        count = _crossings(current, down)
        if count < fewest:
            best, fewest = [list(layer) for layer in current], count
    return best


def _crossings(layers: list[list[str]], down: Mapping[str, list[str]]) -> int:
    total = 0
    for upper, lower in pairwise(layers):
        place = {key: number for number, key in enumerate(lower)}
        ends = [
            place[each]
            for key in upper
            for each in sorted(down.get(key, ()), key=lambda k: place.get(k, -1))
            if each in place
        ]
        total += sum(ends[i] > later for i in range(len(ends)) for later in ends[i + 1 :])
    return total


def _places(
    layers: list[list[str]],
    chains: Mapping[tuple[str, str], list[str]],
    size: Mapping[str, tuple[float, float]],
) -> dict[str, float]:
    """Where the middle of each key lies across: near its neighbours, without overlap and in the order given."""
    up, down = _neighbours(chains)
    half = {key: (size[key][0] / 2 if key in size else 0.4) for layer in layers for key in layer}
    x: dict[str, float] = {}
    for layer in layers:
        edge = 0.0
        for key in layer:
            x[key] = edge + half[key]
            edge += 2 * half[key] + _GAP
        for key in layer:
            x[key] -= edge / 2
    for turn in range(_ROUNDS):
        beside = up if turn % 2 == 0 else down
        for layer in layers if turn % 2 == 0 else layers[::-1]:
            wish = [_mean([x[each] for each in beside.get(key, ())], x[key]) for key in layer]
            _settle(layer, wish, half, x)
    return x


def _mean(values: Sequence[float], otherwise: float) -> float:
    return sum(values) / len(values) if values else otherwise


def _settle(
    layer: Sequence[str], wish: Sequence[float], half: Mapping[str, float], x: dict[str, float]
) -> None:
    """Least-squares places in the given order: pool neighbours that would overlap, as in isotonic regression."""
    offset = 0.0
    shifted: list[tuple[float, float, int]] = []  # sum of (wish - offset), its mean, and count of a pool
    offsets = []
    for number, key in enumerate(layer):
        if number:
            offset += half[layer[number - 1]] + half[key] + _GAP
        offsets.append(offset)
        total, count = wish[number] - offset, 1
        while shifted and shifted[-1][1] > total / count:
            before, _, many = shifted.pop()
            total, count = total + before, count + many
        shifted.append((total, total / count, count))
    number = 0
    for _, mean, count in shifted:
        for _ in range(count):
            x[layer[number]] = mean + offsets[number]
            number += 1


def _curve(points: Sequence[tuple[float, float]], *, downward: bool) -> str:
    (x, y), *rest = points
    path = [f"M{x:.1f} {y:.1f}"]
    for (x0, y0), (x1, y1) in pairwise(points):
        if downward:
            bend = (y0 + y1) / 2
            path.append(f"C{x0:.1f} {bend:.1f} {x1:.1f} {bend:.1f} {x1:.1f} {y1:.1f}")
        else:
            bend = (x0 + x1) / 2
            path.append(f"C{bend:.1f} {y0:.1f} {bend:.1f} {y1:.1f} {x1:.1f} {y1:.1f}")
    x, y = rest[-1]
    head = (
        f"M{x - 0.7:.1f} {y - 1.4:.1f}L{x:.1f} {y:.1f}L{x + 0.7:.1f} {y - 1.4:.1f}"
        if downward
        else f"M{x - 1.4:.1f} {y - 0.7:.1f}L{x:.1f} {y:.1f}L{x - 1.4:.1f} {y + 0.7:.1f}"
    )
    return f'<path d="{"".join(path)}{head}"/>'


def _box(box: Box, middle: tuple[float, float], target: str | None) -> str:
    x, y = middle
    top = y - box.height / 2
    lines = "".join(
        f'<text x="{x:.1f}" y="{top + _PAD + 2.0 + number * _LINE:.1f}" text-anchor="middle" fill="currentColor" stroke="none">{escape(line)}</text>'
        for number, line in enumerate(box.lines)
    )
    body = f'<rect x="{x - box.width / 2:.1f}" y="{top:.1f}" width="{box.width:.1f}" height="{box.height:.1f}" {_OUTLINES[box.kind]}/>{lines}'
    if target is None:
        return f"<g>{body}</g>"
    return f"<a href={quoteattr(target)}>{body}</a>"
