"""The quantity kinds of this trade, as one literal table: SI unit, display units, accepted and refused units.

Rules
-----
* A kind is more than a dimension: Hz and rad/s, N m and N m/rad, a coverage and a bare inverse area share a dimension in the SI.
* The first entry of `si` is canonical. A kind with two entries (drive) is a union: the dimension decides.
* `hints` answer the mistakes made most; each is one sentence and has a test.
"""

from __future__ import annotations

from dataclasses import dataclass
from difflib import get_close_matches

__all__ = ["KINDS", "Kind", "kind_of", "kind_of_si"]

_OSCILLATING = ("rms", "peak", "peak-to-peak")
_PURE = frozenset({"1"})
_SHORT_TIME_S = 1e-6
_SHARE = frozenset({"1", "%", "ppm"})

_PER_MASS_HEAT = (
    "J/(kg K)",
    "that is per mass; a molar heat capacity needs the isotope's molar mass: 1 J/(g K) is 4.002602 J/(mol K) for"
    " helium-4 and 3.016029 J/(mol K) for helium-3",
)
_CYCLES = "without radians that is a cycle frequency; multiply by 2 pi and write rad/s"


@dataclass(frozen=True, slots=True)
class Kind:
    """One kind of quantity.

    Parameters
    ----------
    name : str
        Name used in sheets, columns and the database.
    si : tuple of str
        Coherent SI unit(s); the first is canonical.
    display : tuple of str
        Units people like to read, smallest first.
    examples : tuple of str
        Units named when something else was found.
    description : str
        What it is, in one line.
    symbol : str
        Usual symbol, as LaTeX maths.
    article : str
        "a" or "an", for sentences.
    required : frozenset of str
        Unit names of which at least one must appear (``Hz``); empty for no demand.
    allowed : frozenset of str or None
        The only unit names accepted, or None for whatever has the dimension.
    refused : tuple of (str, str)
        Unit names not accepted, each with the sentence that says why.
    also : tuple of (str, str)
        Units of another dimension that still count, with the exact factor, as a fraction, that takes their SI value to `si[0]`.
    hints : tuple of (str, str)
        Sentences for a unit of the same dimension as the first element.
    conventions : tuple of str
        Words accepted after the unit.
    only_if_asked : tuple of str
        Words accepted only by a field that demands such a word.
    scaled : bool
        Whether a temperature scale may be named.
    """

    name: str
    si: tuple[str, ...]
    display: tuple[str, ...]
    examples: tuple[str, ...]
    description: str
    symbol: str = ""
    article: str = "a"
    required: frozenset[str] = frozenset()
    allowed: frozenset[str] | None = None
    refused: tuple[tuple[str, str], ...] = ()
    also: tuple[tuple[str, str], ...] = ()
    hints: tuple[tuple[str, str], ...] = ()
    conventions: tuple[str, ...] = ()
    only_if_asked: tuple[str, ...] = ()
    scaled: bool = False

    @property
    def words(self) -> str:
        """The name as words of a sentence, with its article."""
        return f"{self.article} {self.name.replace('_', ' ')}"

    @property
    def pure(self) -> bool:
        """Whether a number alone, without a unit, is a complete statement."""
        return self.si == ("1",)


_TABLE = (
    Kind("temperature", ("K",), ("uK", "mK", "K"), ("mK", "K"), "thermodynamic temperature, with its scale", "T", scaled=True),
    Kind("temperature_difference", ("K",), ("uK", "mK", "K"), ("mK", "K"), "difference of two temperatures", r"\Delta T", scaled=True),
    Kind("temperature_rate", ("K/s",), ("uK/s", "mK/s", "K/s"), ("uK/s", "mK/h"), "rate of change of temperature, warming positive", r"\dot T", scaled=True),
    Kind("time", ("s",), ("us", "ms", "s", "h"), ("s", "min", "h"), "length of time; an instant is a date and time instead", "t"),
    Kind("period", ("s",), ("ps", "ns", "us", "ms", "s"), ("ms", "us"), "time of one full oscillation", "P",
         hints=(("Hz", "that is a frequency; write the time of one oscillation"),)),
    Kind("frequency", ("Hz",), ("mHz", "Hz", "kHz", "MHz"), ("Hz", "mHz", "kHz"), "cycles per time", "f", required=frozenset({"Hz"}),
         refused=(("s", "1/s does not say whether cycles or radians; write Hz"),),
         hints=(("s", "that is a period; write its inverse in Hz"), ("rad/s", "that is an angular frequency; divide by 2 pi and write Hz"))),
    Kind("angular_frequency", ("rad/s",), ("mrad/s", "rad/s"), ("rad/s",), "phase angle per time, 2 pi times the frequency", r"\omega", "an",
         hints=(("Hz", _CYCLES),)),
    Kind("dissipation", ("1",), ("1", "ppm"), ("1", "ppm"), "inverse quality factor, full width at half power over frequency", "Q^{-1}", allowed=frozenset({"1", "ppm"}),
         hints=(("Hz", "a half width has to be divided by the frequency first"),)),
    Kind("quality_factor", ("1",), ("1",), ("1",), "quality factor of a resonance", "Q", allowed=_PURE),
    Kind("resistance", ("Ohm",), ("mOhm", "Ohm", "kOhm", "MOhm"), ("Ohm", "kOhm"), "electrical resistance; two-wire or four-wire is stated with the reading", "R"),
    Kind("conductance", ("S",), ("nS", "uS", "mS", "S"), ("uS", "mS"), "electrical conductance", "G", required=frozenset({"S"}), hints=(("Ohm", "that is a resistance; write its inverse in S"),)),
    Kind("mutual_inductance", ("H",), ("nH", "uH", "mH", "H"), ("uH", "nH"), "mutual inductance of a coil pair", "M"),
    Kind("inductance", ("H",), ("nH", "uH", "mH", "H"), ("uH", "mH"), "self-inductance", "L", "an"),
    Kind("capacitance", ("F",), ("pF", "nF", "uF"), ("pF",), "electrical capacitance", "C"),
    Kind("pressure", ("Pa",), ("mPa", "Pa", "kPa", "MPa"), ("Pa", "mbar", "Torr"), "pressure, absolute or gauge", "p",
         conventions=("absolute", "gauge"), only_if_asked=("gauge",), refused=(("J", "write Pa for a pressure"),)),
    Kind("pressure_ratio", ("1",), ("1",), ("1", "%"), "ratio of two absolute pressures", "p/p_0", allowed=_SHARE),
    Kind("relative_pressure", ("1",), ("1",), ("1", "%"), "pressure over the saturated vapour pressure at the same temperature", "p/p_0", allowed=_SHARE),
    Kind("volume", ("m^3",), ("mm^3", "cm^3", "L", "m^3"), ("cm^3", "L"), "volume", "V"),
    Kind("area", ("m^2",), ("mm^2", "cm^2", "m^2"), ("m^2", "cm^2"), "area; geometric or by gas adsorption is stated beside it", "A", "an"),
    Kind("specific_area", ("m^2/kg",), ("m^2/g",), ("m^2/g",), "area per mass of substrate", "a"),
    Kind("length", ("m",), ("nm", "um", "mm", "m"), ("mm", "um", "nm", "angstrom"), "length", "l", conventions=_OSCILLATING),
    Kind("mass", ("kg",), ("ng", "ug", "mg", "g", "kg"), ("g", "mg"), "mass", "m"),
    Kind("amount", ("mol",), ("nmol", "umol", "mmol", "mol"), ("umol", "mmol", "cm3_STP_0C_101325Pa"), "amount of substance", "n", "an",
         hints=(("m^3", "a gas volume is an amount only with its reference state: cm3_STP_0C_101325Pa or cm3_STP_0C_100kPa"),)),
    Kind("specific_amount", ("mol/kg",), ("umol/g", "mmol/g"), ("umol/g", "mmol/g"), "amount adsorbed per mass of substrate", "n_s"),
    Kind("coverage", ("mol/m^2",), ("nmol/m^2", "umol/m^2", "mmol/m^2"), ("umol/m^2", "atoms/nm^2"), "amount adsorbed per area", "n",
         hints=(("1/m^2", "an inverse area does not say what is counted; write atoms/nm^2 or atoms/angstrom^2"),
                ("kg/m^2", "a mass per area becomes a coverage only with the isotope's molar mass; record it as an areal mass density, or write umol/m^2"))),
    Kind("areal_mass_density", ("kg/m^2",), ("ng/cm^2", "ug/cm^2", "kg/m^2"), ("kg/m^2", "g/cm^2"), "mass per area; film mass or superfluid mass is stated beside it", r"\sigma", "an",
         hints=(("mol/m^2", "an amount per area is a coverage and becomes a mass only with the isotope's molar mass"),)),
    Kind("density", ("kg/m^3",), ("kg/m^3",), ("kg/m^3", "g/cm^3"), "mass per volume", r"\rho"),
    Kind("moment_of_inertia", ("kg m^2",), ("g cm^2", "kg m^2"), ("g cm^2", "kg m^2"), "moment of inertia about the torsion axis", "I"),
    Kind("torsion_constant", ("N m/rad",), ("mN m/rad", "N m/rad"), ("N m/rad", "dyn cm/rad"), "torque per angle of twist", r"\kappa",
         hints=(("N m", "that is a torque; write N m/rad or dyn cm/rad"),)),
    Kind("mass_sensitivity", ("s/kg",), ("ns/ug", "s/kg"), ("ns/ug",), "change of period per mass", r"\partial P/\partial m",
         hints=(("Hz/kg", "this kind is a change of period; write s per mass"),)),
    Kind("areal_mass_sensitivity", ("s m^2/kg",), ("ns cm^2/ng", "s m^2/kg"), ("ns cm^2/ng",), "change of period per mass per area", r"\partial P/\partial\sigma", "an"),
    Kind("amount_sensitivity", ("s/mol",), ("ns/umol", "s/mol"), ("ns/umol",), "change of period per amount", r"\partial P/\partial n", "an"),
    Kind("angular_momentum", ("kg m^2/s",), ("g cm^2/s", "kg m^2/s"), ("kg m^2/s", "g cm^2/s"), "angular momentum", "L", "an"),
    Kind("heat_capacity", ("J/K",), ("uJ/K", "mJ/K", "J/K"), ("mJ/K", "J/K"), "heat capacity of the whole cell unless the addendum is said to be taken off", "C"),
    Kind("molar_heat_capacity", ("J/(mol K)",), ("mJ/(mol K)", "J/(mol K)"), ("J/(mol K)",), "heat capacity per amount", "c", hints=(_PER_MASS_HEAT,)),
    Kind("specific_heat", ("J/(kg K)",), ("J/(g K)",), ("J/(g K)", "J/(kg K)"), "heat capacity per mass", "c",
         hints=(("J/(mol K)", "that is per amount; record it as a molar heat capacity"),)),
    Kind("viscosity", ("Pa s",), ("nPa s", "uPa s", "mPa s", "Pa s"), ("uPa s", "uP"), "dynamic viscosity", r"\eta"),
    Kind("diffusivity", ("m^2/s",), ("um^2/s", "cm^2/s", "m^2/s"), ("cm^2/s", "m^2/s"), "diffusion constant", "D"),
    Kind("velocity", ("m/s",), ("um/s", "mm/s", "m/s"), ("um/s", "cm/s"), "velocity", "v", conventions=_OSCILLATING),
    Kind("voltage", ("V",), ("nV", "uV", "mV", "V"), ("mV", "V"), "voltage", "U", conventions=_OSCILLATING),
    Kind("current", ("A",), ("nA", "uA", "mA", "A"), ("uA", "mA"), "electric current", "I", conventions=_OSCILLATING),
    Kind("amplitude", ("V",), ("nV", "uV", "mV", "V"), ("uV", "mV"), "detected signal of an oscillator", "A", "an", conventions=_OSCILLATING),
    Kind("drive", ("V", "A"), ("uV", "mV", "V", "uA", "mA", "A"), ("mV", "V", "uA"), "excitation of an oscillator, as voltage or current", "D", conventions=_OSCILLATING),
    Kind("power", ("W",), ("pW", "nW", "uW", "mW", "W"), ("nW", "uW"), "power", r"\dot Q"),
    Kind("charge", ("C",), ("pC", "nC", "uC", "C"), ("C", "nC"), "electric charge", "q"),
    Kind("angle", ("rad",), ("nrad", "urad", "mrad", "rad"), ("rad", "mrad", "deg"), "plane angle", r"\theta", "an", conventions=_OSCILLATING),
    Kind("phase", ("rad",), ("mrad", "rad"), ("rad", "deg"), "phase angle", r"\varphi"),
    Kind("magnetic_flux_density", ("T",), ("uT", "mT", "T"), ("mT", "T"), "magnetic flux density", "B"),
    Kind("torque", ("N m",), ("nN m", "uN m", "mN m", "N m"), ("N m", "dyn cm"), "torque", r"\tau",
         refused=(("J", "a torque is written N m, not in units of energy"), ("erg", "a torque is written dyn cm, not in units of energy")), conventions=_OSCILLATING),
    Kind("surface_tension", ("N/m",), ("mN/m", "N/m"), ("mN/m", "dyn/cm"), "surface tension", r"\gamma"),
    Kind("molar_mass", ("kg/mol",), ("g/mol",), ("g/mol",), "mass per amount", "M"),
    Kind("atoms_area", ("m^2",), ("angstrom^2", "nm^2"), ("angstrom^2", "nm^2", "nm^2/atoms"), "area taken by one adsorbed atom or molecule", "a_m", "an",
         # An area per amount, divided by the Avogadro constant (exact, SI Brochure 2.3.1).
         also=(("m^2/mol", "1/602214076000000000000000"),)),
    Kind("fraction", ("1",), ("1",), ("1", "%", "ppm"), "part of a whole", "x", allowed=_SHARE),
    Kind("number", ("1",), ("1",), ("1",), "pure number", allowed=_PURE),
    Kind("count", ("1",), ("1",), ("1",), "number of counted things", "N", allowed=_PURE),
)  # fmt: skip

KINDS: dict[str, Kind] = {kind.name: kind for kind in _TABLE}


def kind_of(name: str) -> Kind:
    """Return the kind with that name.

    Parameters
    ----------
    name : str
        For instance ``coverage``.

    Returns
    -------
    Kind
        The row of the table.

    Raises
    ------
    ValueError
        If there is no such kind.

    Examples
    --------
    >>> kind_of("coverage").si
    ('mol/m^2',)
    """
    found = KINDS.get(name)
    if found is None:
        near = get_close_matches(name, KINDS, n=3)
        hint = f"; did you mean {' or '.join(near)}?" if near else ""
        raise ValueError(
            f"found quantity kind {name[:64]!r}; expected one of {len(KINDS)} kinds such as coverage{hint}"
        )
    return found


def kind_of_si(unit: str, value: float | None = None) -> str | None:
    """Return the first kind whose SI unit this is, for a number of which no more than its unit is known.

    A time of less than a microsecond is taken for the change of a period, which people read in ns and ps.

    Examples
    --------
    >>> kind_of_si("mol/m^2"), kind_of_si("furlong"), kind_of_si("s", 3600.0), kind_of_si("s", -7e-13)
    ('coverage', None, 'time', 'period')
    """
    if unit == "s" and value is not None and 0 < abs(value) < _SHORT_TIME_S:
        return "period"
    return next((name for name, each in KINDS.items() if unit in each.si), None)
