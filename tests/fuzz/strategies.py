"""Vocabulary of hostile input: good examples with pieces cut, doubled, swapped and replaced by what has hurt before."""

from __future__ import annotations

import io
import struct
import zipfile
from functools import cache
from importlib import resources

import numpy as np
from hypothesis import strategies as st

from tests.small_cooldown import SHEET

__all__ = ["HOSTILE", "SEEDS", "hostile_text", "mutated"]

HOSTILE: tuple[str, ...] = (
    "", " ", "\x00", "\x1b]0;owned\x07", "\u202e", "\ufeff", "\ud83d\ude00".encode("utf-16", "surrogatepass").decode("utf-16"),
    "=1+1", "@SUM(1)", "+1", "-1", "\tx", "../../etc/passwd", "/etc/passwd", "C:\\x", "CON", "nul.csv", "a:b", "~", "%00",
    "'; DROP TABLE sealed_file; --", '"', "'", '"""', "'''", "[", "]", "[[", "]]", "{", "}", "=", "#", ",", "\r", "\n", "\\",
    "\\input{/etc/passwd}", "\\write18{id}", "^^5cinput", "{{7*7}}", "((( 7 )))", "<script>alert(1)</script>", "&#x3c;",
    "1e999", "-1e999", "nan", "inf", "9" * 400, "9" * 5000, "1(" + "9" * 50 + ")", "0x1p-1074", "1_0", "٣", "½", "1e-400 K",
    "2026-03-02T09:00:00+02:00", "0001-01-01T00:00:00+23:59", "9999-12-31T23:59:59-23:59", "2026-02-30", "24:00:00",
    "true", "[1, 2]", "{ a = 1 }", "K", "ITS-90", "umol/m^2", "layers", "s001", "bob.r1", "bob.r2", "bob.r999999",
    "temperature", "period", "rms", "instant", "1.1.1", "a." * 80 + "a", "[" * 200, "é", "e\u0301", "ß", "ſ", "K", "\u2028",
    "0", "1", "-1", "0.0", "-0.0", "1e308", "1e-308", "1 K", "0 K", "-1 K", "1 m", "0.0 cm^3", "0 Pa", "1e30 umol", "0(0) mm",
)  # fmt: skip

_PIECES = st.sampled_from([text.encode("utf-8", "surrogatepass") for text in HOSTILE])


@cache
def _zip(kind: int) -> bytes:
    stream = io.BytesIO()
    with zipfile.ZipFile(stream, "w", kind) as bundle:
        for name, array in (("t", np.arange(4.0)), ("x", np.zeros((2, 3))), ("w", np.array(["a", "b"]))):
            member = io.BytesIO()
            np.save(member, array)
            bundle.writestr(f"{name}.npy", member.getvalue())
    return stream.getvalue()


@cache
def _npy(*, structured: bool) -> bytes:
    stream = io.BytesIO()
    plain = np.arange(12.0).reshape(4, 3)
    np.save(stream, np.array([(1, 2.0), (3, 4.0)], dtype=[("t", "i8"), ("x", "f4")]) if structured else plain)
    return stream.getvalue()


def _npy_claiming(header: str) -> bytes:
    text = header.encode("latin-1") + b"\n"
    return b"\x93NUMPY\x01\x00" + struct.pack("<H", len(text)) + text


@cache
def _plan() -> bytes:
    return (resources.files("archive.reduction") / "plans" / "film-transition.toml").read_bytes()


_TABLE = (
    b'# made\ntime,T (K),note\n2026-03-02T09:10:00+02:00,0.5,"a, b"\n2026-03-02T09:11:00+02:00,9.9E37,-\n'
)

_RICH = (
    SHEET.replace("NAME", "2026-03")
    + """
    thermometer = "temperature"

[sweep.channels.r]
column = 3
quantity = "resistance"
unit = "ohm"
thermometer = "RX.r1"
calibration = "RX-cal.r1"
sentinels = ["9.9E37"]
full_scale = "10 kohm"

[[gauge]]
name = "g1"
range = "10 Torr"
relative_uncertainty = 0.001

[[doser]]
name = "v1"
volume = "10.0(1) cm^3"
how = "expansion"

[[dose]]
name = "d03"
at = 2026-03-07T10:00:00+02:00
pressure_before = "10 Torr"
pressure_after = "2 Torr"
temperature_before = "295 K on ITS-90"
doser = "v1"
gauge = "g1"

[[record.thermometer]]
name = "RX"
revision = 1
kind = "ruthenium-oxide"
place = "cell"

[[record.calibration]]
name = "RX-cal"
revision = 1
thermometer = "RX.r1"
scale = "PLTS-2000"
against = "melting curve"
reading_unit = "ohm"
date = 2026-01-10
relation = { form = "spline" }
points = [[1.0, 0.9], [1.000003, 0.5], [1.000006, 0.4], [1.000009, 0.3], [1.00002, 0.2]]
temperature_low = "0.2 K"
temperature_high = "0.9 K"
relative_uncertainty = 0.01

[[effect]]
effect = "self-heating"
state = "bounded"
bound = "1 mK"
reason = "drive swept"

[[waiver]]
check = "helium3-content"
place = "well-helium.r1"
reason = "known to be small"
role = "data steward"
date = 2026-04-01
"""
).encode()

SEEDS: dict[str, tuple[bytes, ...]] = {
    "sheet": (SHEET.replace("NAME", "2026-03").encode(), _RICH),
    "act-sheet": (
        b'format = "stillroom-amendment/1"\ncooldown = "2026-03"\nwhy = "wrong gauge"\nrole = "data steward"\n\n'
        b'[[change]]\nat = "dose[d01].amount"\nfrom = "40.0(1) umol"\nto = "41.0(1) umol"\n',
        b'format = "stillroom-revision/1"\n\n[cell]\nname = "bob"\nrevision = 2\nkind = "torsional-oscillator"\n',
    ),
    "settings": (b'name = "lab"\nindex = "sqlite:///index.sqlite3"\n\n[thresholds]\n\n[exchange]\n',),
    "plan": (_plan(),),
    "table": (_TABLE, _TABLE.replace(b",", b";"), _TABLE.replace(b",", b"\t"), _TABLE.replace(b"\n", b"\r\n")),
    "drafted": (_TABLE, b"a b\n1 2\n3 4\n", b"01.03.2026 10:00:00;1,5\n01.03.2026 10:00:01;1,6\n"),
    "array-source": (
        _zip(zipfile.ZIP_STORED), _zip(zipfile.ZIP_DEFLATED), _zip(zipfile.ZIP_LZMA), _zip(zipfile.ZIP_BZIP2),
        _npy(structured=False), _npy(structured=True),
        _npy_claiming("{'descr': '<U0', 'fortran_order': False, 'shape': (1000000000000,), }"),
        _npy_claiming("{'descr': [], 'fortran_order': False, 'shape': (1000000000000,), }"),
        _npy_claiming("{'descr': '|V0', 'fortran_order': True, 'shape': (-1, -1), }"),
        _npy_claiming("{'descr': '<f8', 'fortran_order': False, 'shape': (1000000000000,), }"),
    ),
    "bag": (
        b"\n" + b"BagIt-Version: 1.0\nTag-File-Character-Encoding: UTF-8\n",
        b"1\nPayload-Oxum: 1.1\nBagging-Date: 2026-12-01\n more\n",
        b"22\n" + b"0" * 128 + b"  data/a\n" + b"0" * 128 + b"  data/%25.csv\n",
        b"333\n" + b"0" * 128 + b"  bagit.txt\n",
        b"55555\n" + b'{"format": "stillroom-package/1", "asked": ["2026-03"], "files": [{"key": "2026-03/2026-03.a1", "path": '
        b'"sealed/2026-03/2026-03.a1.h5", "address": "2026-03.a1", "format": "x", "sha256": "' + b"0" * 64 + b'", "size": 1, '
        b'"because": "asked for"}]}',
    ),
}  # fmt: skip


@st.composite
def mutated(draw: st.DrawFn, name: str) -> bytes:
    """Give a good example of a target's input with some pieces spoilt."""
    data = draw(st.sampled_from(SEEDS[name]))
    for _ in range(draw(st.integers(0, 6))):
        begin = draw(st.integers(0, len(data)))
        end = min(len(data), begin + draw(st.integers(0, 40)))
        piece = draw(st.one_of(_PIECES, st.binary(max_size=8), st.just(data[begin:end] * 2)))
        how = draw(st.integers(0, 3))
        if how == 0:
            data = data[:begin] + piece + data[end:]
        elif how == 1:
            data = data[:begin] + piece + data[begin:]
        elif how == 2:
            other = draw(st.integers(0, len(data)))
            data = data[:begin] + data[other : other + 60] + data[begin:]
        else:
            data = _value_replaced(data, draw(st.integers(0, 60)), piece)
    return data


def _value_replaced(data: bytes, which: int, piece: bytes) -> bytes:
    """Put a piece in the place of what stands behind an equals sign: what a person gets wrong most."""
    lines = data.split(b"\n")
    places = [number for number, line in enumerate(lines) if b" = " in line]
    if not places:
        return data
    number = places[which % len(places)]
    key, _, old = lines[number].partition(b" = ")
    quoted = old.startswith(b'"') and b'"' not in piece and b"\\" not in piece and b"\n" not in piece
    lines[number] = key + b" = " + (b'"' + piece + b'"' if quoted else piece)
    return b"\n".join(lines)


def hostile_text() -> st.SearchStrategy[str]:
    """Give texts made of hostile pieces, ranges, quantities and anything else."""
    piece = st.one_of(
        st.sampled_from(HOSTILE),
        st.text(max_size=6),
        st.sampled_from(["1:2 K", "T_KT=", ":", " ", "0.4:", "1(2)"]),
    )
    return st.lists(piece, max_size=5).map("".join)  # fmt: skip
