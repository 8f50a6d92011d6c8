"""Internal units, the constants of nature in them, and quantities read and printed.

Internal units  length nm, time ps, mass u, charge e, temperature K.
Hence           energy u nm²/ps², torque the same, force u nm/ps²,
                electric field u nm/ps²/e, polarizability e² ps²/u,
                angular momentum u nm²/ps.
One u nm²/ps² is one kJ/mol to 1e-9 (`KJ_PER_MOL` says by how much they differ).

Constants are CODATA's, through scipy.constants.

A quantity is text, a number and a unit: ``parse("120 fs", "time")`` is 0.12, and
``text(0.12, "time")`` is "0.12 ps". pint knows what a symbol means; it never sees text that
a user wrote, only symbols of the list below, one at a time. All conversion is decimal, so
that 0.78 g/cm^3 is 780 kg/m^3 to the last digit and hashes of configs are stable.
"""

import decimal
import difflib
import functools
import math
import re
from collections.abc import Callable
from dataclasses import dataclass, field
from decimal import Decimal

from scipy import constants as _si

from swirlight.errors import InputError

ATOMIC_MASS = _si.atomic_mass  # kg in 1 u
NANOMETRE, PICOSECOND = 1e-9, 1e-12  # m, s
JOULE = 1.0 / (ATOMIC_MASS * (NANOMETRE / PICOSECOND) ** 2)  # u nm²/ps² in 1 J
KJ_PER_MOL = 1e3 / _si.N_A * JOULE  # u nm²/ps² in 1 kJ/mol
VOLT_PER_METRE = _si.e * NANOMETRE * JOULE  # u nm/ps²/e in 1 V/m
COULOMB_METRE = 1.0 / (_si.e * NANOMETRE)  # e nm in 1 C m
COULOMB_METRE2_PER_VOLT = COULOMB_METRE / VOLT_PER_METRE  # e² ps²/u in 1 C m²/V
CUBIC_ANGSTROM = 4e-30 * _si.pi * _si.epsilon_0 * COULOMB_METRE2_PER_VOLT  # e² ps²/u, α/4πε0 = 1 Å³
WATT_PER_CM2 = JOULE * 1e4 * NANOMETRE**2 * PICOSECOND  # u/ps³ in 1 W/cm²
BAR = 1e5 * NANOMETRE**3 * JOULE  # u/nm/ps² in 1 bar

BOLTZMANN = _si.k * JOULE  # u nm²/ps²/K
HBAR = _si.hbar * JOULE / PICOSECOND  # u nm²/ps
LIGHT_SPEED = _si.c * PICOSECOND / NANOMETRE  # nm/ps
VACUUM_PERMITTIVITY = _si.epsilon_0 * NANOMETRE / (_si.e**2 * JOULE)  # e² ps²/(u nm³)
COULOMB = 1.0 / (4.0 * _si.pi * VACUUM_PERMITTIVITY)  # u nm³/ps²/e²

# The symbols a user may write. Those of the first table take the prefixes.
_PREFIXES = {"a": -18, "f": -15, "p": -12, "n": -9, "µ": -6, "u": -6, "m": -3, "c": -2, "d": -1,
             "k": 3, "M": 6, "G": 9, "T": 12, "P": 15}  # fmt: skip
_BASE = {"m": "length", "s": "time", "g": "mass", "A": "current", "K": "temperature",
         "rad": "angle"}  # fmt: skip
_DERIVED = {
    "mol": f"{_si.N_A!r}", "Hz": "1 / s", "N": "1000 * g * m / s**2", "Pa": "N / m**2",
    "J": "N * m", "W": "J / s", "C": "A * s", "V": "J / C", "F": "C / V", "T": "V * s / m**2",
    "eV": f"{_si.e!r} * J", "bar": "100000 * Pa", "cal": "4.184 * J",
}  # fmt: skip
_PLAIN = {
    "min": "60 * s", "h": "3600 * s", "u": f"{_si.atomic_mass!r} * 1000 * g",
    "e": f"{_si.e!r} * C", "Å": "1e-10 * m", "angstrom": "1e-10 * m",
    "bohr": f"{_si.physical_constants['Bohr radius'][0]!r} * m",
    "deg": "3.141592653589793238462643383279503 / 180 * rad", "atm": "101325 * Pa",
    "D": f"1e-21 / {_si.c!r} * C * m", "hbar": f"{_si.hbar!r} * J * s",
}  # fmt: skip
SYMBOLS = frozenset(_PLAIN) | {p + s for p in ("", *_PREFIXES) for s in (*_BASE, *_DERIVED)}

_NUMBER = r"[+-]?(?:[0-9]+\.?[0-9]*|\.[0-9]+)(?:[eE][+-]?[0-9]{1,3})?"
_FACTOR = r"[A-Za-zÅµ]+(?:\^-?[0-9])?"
_UNIT = rf"{_FACTOR}(?:(?: *[*/] *| +){_FACTOR}){{0,5}}"
# Between a number and its unit: a space, or the / of "2 /ps".
_TAIL = rf"(?: +(?:1 ?/ ?)?| */ ?){_UNIT}"
QUANTITY_PATTERN = rf"^{_NUMBER}{_TAIL}$"
VECTOR_PATTERN = rf"^{_NUMBER} +{_NUMBER} +{_NUMBER}{_TAIL}$"
LONGEST = 80  # characters of a quantity

_PI = Decimal("3.14159265358979323846264338327950288")
_EXACT = decimal.Context(prec=34)


@dataclass(frozen=True)
class Kind:
    """A kind of quantity.

    unit : the internal unit.
    shown : the one unit in which values are printed.
    routes : other dimensions in which a user may give it; their unit, and the internal value
        per that unit (or as a function of the number in it).
    """

    name: str
    unit: str
    shown: str
    example: str
    routes: dict[str, float | Decimal | Callable] = field(default_factory=dict, hash=False)

    def __str__(self):
        return ("an " if self.name[0] in "aei" else "a ") + self.name


_SPEED = Decimal(LIGHT_SPEED)
KINDS = {
    kind.name: kind
    for kind in (
        Kind("time", "ps", "ps", "120 fs"),
        Kind("length", "nm", "nm", "1.0 nm"),
        Kind("mass", "u", "u", "14.0 u"),
        Kind("charge", "e", "e", "0.20 e"),
        Kind("temperature", "K", "K", "298.15 K"),
        Kind("angle", "rad", "deg", "30 deg"),
        Kind("rate", "1/ps", "/ps", "2 /ps"),
        Kind("angular velocity", "rad/ps", "rad/ps", "0.5 rad/ps"),
        Kind("angular acceleration", "rad/ps^2", "rad/ps^2", "0.1 rad/ps^2"),
        Kind("inverse length", "1/nm", "/nm", "3.5 /nm"),
        Kind("density", "u/nm^3", "g/cm^3", "0.777 g/cm^3"),
        Kind("energy", "u nm^2/ps^2", "kJ/mol", "0.8 kJ/mol", {"K": BOLTZMANN}),
        Kind("pressure", "u/nm/ps^2", "bar", "1 bar"),
        Kind("inertia", "u nm^2", "u nm^2", "0.6 u nm^2"),
        Kind("angular momentum", "u nm^2/ps", "hbar", "1 hbar"),
        Kind("dipole", "e nm", "D", "1.85 D"),
        Kind("field", "u nm/ps^2/e", "V/m", "2.7e8 V/m"),
        Kind("intensity", "W/cm^2", "W/cm^2", "5e11 W/cm^2"),
        Kind("fluence", "J/cm^2", "J/cm^2", "20 mJ/cm^2"),
        Kind("polarizability", "e^2 ps^2/u", "angstrom^3", "4.5 angstrom^3",
             {"nm^3": 4 * _PI * Decimal(VACUUM_PERMITTIVITY)}),
        Kind("rectification", "e^3 ps^4/u^2/nm", "C m^3/V^2", "1e-50 C m^3/V^2"),
        Kind("heat capacity", "u nm^2/ps^2/K", "J/mol/K", "75.3 J/mol/K"),
        # Frequency, vacuum wavelength, wavenumber or photon energy; kept as angular frequency.
        Kind("carrier", "rad/ps", "THz", "800 nm", {
            "THz": 2 * _PI,
            "nm": lambda wavelength: 2 * _PI * _SPEED / wavelength,
            "1/nm": 2 * _PI * _SPEED,
            "u nm^2/ps^2": 1 / Decimal(HBAR),
        }),
    )
}  # fmt: skip


def parse(text, kind, low=None, high=None):
    """The value of one quantity in internal units, as a float.

    text : a number and a unit, such as "120 fs".
    kind : a name of `KINDS`.
    low, high : quantities between which it must lie, ends included.
    Raises ValueError saying what is wrong with it, without repeating the text.
    """
    kind = KINDS[kind]
    number, unit = _split(text, QUANTITY_PATTERN)
    return _between(_convert(number[0], unit, kind), kind, low, high)


def parse_vector(text, kind, low=None, high=None):
    """Three values with one unit, such as "0 0 0.1177 nm", as a tuple of floats; see `parse`."""
    kind = KINDS[kind]
    numbers, unit = _split(text, VECTOR_PATTERN)
    return tuple(_between(_convert(n, unit, kind), kind, low, high) for n in numbers)


def parse_quantity(text, kind):
    """`parse` for callers from Python: its ValueError becomes an InputError with the text."""
    try:
        return parse(text, kind)
    except ValueError as error:
        raise InputError(f"{str(text)[:LONGEST]!r} {error}; expected {KINDS[kind]}, for example "
                         f'"{KINDS[kind].example}"') from None


def text(value, kind):
    """A value in internal units as text in the unit of its kind that is always shown.

    The shortest such text that `parse` reads back as the same float.
    """
    return f"{_number_text(value, KINDS[kind])} {KINDS[kind].shown}"


def vector_text(values, kind):
    """Three values with one unit, as `parse_vector` reads them back."""
    kind = KINDS[kind]
    return " ".join([*(_number_text(v, kind) for v in values), kind.shown])


def brief(value, kind, digits=4):
    """A value in internal units, rounded for reading: number and the shown unit."""
    kind = KINDS[kind]
    return f"{value / float(_route(kind, kind.shown)(Decimal(1))):.{digits}g} {kind.shown}"


def _split(text, pattern):
    """Numbers (as Decimals) and unit of a quantity that fits the pattern."""
    if not isinstance(text, str):
        raise ValueError("needs a number and a unit")
    if len(text) > LONGEST:
        raise ValueError(f"is longer than {LONGEST} characters")
    text = text.strip().replace("μ", "µ").replace("\N{ANGSTROM SIGN}", "Å")
    if not re.match(pattern, text):
        raise ValueError(_misfit(text, pattern))
    numbers = []
    rest = text
    while found := re.match(rf"{_NUMBER}(?= |/)", rest):
        if len(numbers) == 1 and pattern is QUANTITY_PATTERN:
            break  # the 1 of "2 1/ps"
        if len(numbers) == 3:
            break
        numbers.append(Decimal(found.group()))
        rest = rest[found.end() :].lstrip()
    return numbers, rest


def _misfit(text, pattern):
    """What keeps this text from being a quantity, or a vector."""
    count = 3 if pattern is VECTOR_PATTERN else 1
    if "," in text:
        return "has a comma: write a decimal point, and spaces between numbers"
    numbers = re.match(rf"(?:{_NUMBER}(?: +|$))*", text).group().split()
    if len(numbers) == count and re.fullmatch(rf"(?:{_NUMBER} *)+", text):
        return "has no unit"
    if not re.match(_NUMBER, text):
        return "does not begin with a number"
    if count == 1 and len(numbers) > 1:
        return f"has {len(numbers)} numbers"
    if count == 3 and len(numbers) != 3:
        return f"has {len(numbers)} numbers instead of three"
    if count == 1 and re.fullmatch(rf"{_NUMBER}{_UNIT}", text):
        return "needs a space between number and unit"
    carets = re.sub(r"([A-Za-zµÅ°])([+-]?[1-9])(?![0-9])", r"\1^\2", text)  # the habit of "cm-1"
    if carets != text and re.match(pattern, carets):
        return f'writes a power without its sign (did you mean "{carets}"?)'
    return "is no number with a unit (units are symbols with one-digit powers, joined by a " \
        "space, * or /, six at most)"


def _convert(number, unit, kind):
    """A number with a checked unit text as an internal float."""
    try:
        with decimal.localcontext(_EXACT):
            return float(_route(kind, unit)(number))
    except decimal.DivisionByZero:
        raise ValueError("must not be zero") from None


def _between(value, kind, low, high):
    """The value, if it lies between two quantities given as text."""
    small = parse(low, kind.name) if low is not None else -math.inf
    large = parse(high, kind.name) if high is not None else math.inf
    # The wavelength runs against the carrier's angular frequency.
    if not min(small, large) <= value <= max(small, large) or not math.isfinite(value):
        limits = [f"at least {low}"] * (low is not None) + [f"at most {high}"] * (high is not None)
        raise ValueError(f"is out of range ({', '.join(limits) or 'not finite'})")
    return value


@functools.lru_cache(maxsize=256)
def _route(kind, unit):
    """The function from a number in some unit to the kind's internal value, both Decimal."""
    with decimal.localcontext(_EXACT):
        factor, dimension = _scale(unit)
        for target, onward in {kind.unit: Decimal(1), **kind.routes}.items():
            scale, wanted = _scale(target)
            if dimension == wanted:
                ratio = factor / scale
                if callable(onward):
                    return lambda number: onward(number * ratio)
                ratio *= Decimal(onward)
                return lambda number: number * ratio
    raise ValueError(f'"{unit}" is not the unit of {kind}')


@functools.lru_cache(maxsize=256)
def _scale(unit):
    """One such unit in base units (Decimal), and its dimension."""
    registry, total = _registry(), 1
    unit = re.sub(r"^1? */ *", "/", unit)
    for sign, symbol, power in re.findall(r"([/]?) *([A-Za-zÅµ]+)(?:\^(-?[0-9]))?", unit):
        if symbol not in SYMBOLS:
            raise ValueError(f'has the unknown unit "{symbol}"{_similar(symbol)}')
        exponent = int(power or 1) * (-1 if sign else 1)
        total = total * registry.parse_units(symbol.replace("µ", "u")) ** exponent
    quantity = registry.Quantity(Decimal(1), total).to_base_units()
    return Decimal(quantity.magnitude), quantity.dimensionality


def _similar(symbol):
    if symbol in ("degC", "C°", "celsius"):
        return "; temperatures are in K"
    # Of ps and Ps the small one is meant.
    same = sorted((s for s in SYMBOLS if s.lower() == symbol.lower()), reverse=True)
    near = same or difflib.get_close_matches(symbol, sorted(SYMBOLS), n=1, cutoff=0.75)
    return f'; did you mean "{near[0]}"?' if near else ""


@functools.cache
def _registry():
    """A pint registry that holds the symbols above and nothing else."""
    import pint  # a fifth of a second that --help need not wait for

    registry = pint.UnitRegistry(None, non_int_type=Decimal)
    for symbol, power in _PREFIXES.items():
        if symbol != "µ":
            registry.define(f"{symbol}- = 1e{power}")
    for symbol, dimension in _BASE.items():
        registry.define(f"{symbol} = [{dimension}]")
    for symbol, meaning in (_DERIVED | _PLAIN).items():
        registry.define(f"{symbol} = {meaning}")
    return registry


def _number_text(value, kind):
    """The number before the shown unit: the fewest digits that read back as this float."""
    if value == 0.0:
        return "0"
    with decimal.localcontext(_EXACT):
        exact = Decimal(value) / _route(kind, kind.shown)(Decimal(1))
    for digits in range(1, 18):
        number = f"{exact:.{digits - 1}e}"
        if _convert(Decimal(number), kind.shown, kind) == value:
            break
    mantissa, exponent = number.split("e")
    if -4 <= int(exponent) < 7:
        return f"{Decimal(number).normalize(_EXACT):f}"
    return f"{mantissa}e{int(exponent)}"
