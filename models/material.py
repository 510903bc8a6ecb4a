"""Magnet materials: the numbers of a grade by its open-standard designation, and the remanence at temperature.

The designations are those of IEC 60404-8-1: family, energy product [kJ/m3] and a tenth of the coercivity of
polarization [kA/m]. The numbers are the standard's minimum values as remembered, not read in it: every one is marked
``from_memory``, and a user's own table always wins. Temperature coefficients and recoil permeabilities are typical
values of the family.
"""

from __future__ import annotations

from dataclasses import dataclass
from difflib import get_close_matches

from .errors import InputError

REFERENCE_C = 20.0


@dataclass(frozen=True)
class Material:
    """A magnet material at 20 C, in SI units.

    Attributes:
        name: Its designation, or what a user calls it.
        remanence: Br [T].
        hcb: Coercivity of flux density [A/m], None if not known.
        hcj: Coercivity of polarization [A/m], None if not known.
        recoil_permeability: Slope of the recoil line over mu0; 1 is rigid.
        remanence_temperature_coefficient: Relative change of Br with temperature [1/K], None if not known.
        source: Where the numbers come from.
        from_memory: Are they remembered rather than read in the source?
    """

    name: str
    remanence: float
    hcb: float | None = None
    hcj: float | None = None
    recoil_permeability: float = 1.0
    remanence_temperature_coefficient: float | None = None
    source: str = ""
    from_memory: bool = False


@dataclass(frozen=True)
class _Family:
    coefficient: float
    recoil: float


_FERRITE = _Family(-2.0e-3, 1.07)
_NEODYMIUM = _Family(-1.1e-3, 1.05)
_BONDED_NEODYMIUM = _Family(-1.1e-3, 1.2)
_SAMARIUM_1_5 = _Family(-0.4e-3, 1.05)
_SAMARIUM_2_17 = _Family(-0.3e-3, 1.07)

# Designation: family, Br [mT], HcB [kA/m], HcJ [kA/m].
_MINIMA: dict[str, tuple[_Family, float, float, float]] = {
    "HF 8/22": (_FERRITE, 200, 125, 220),
    "HF 24/16": (_FERRITE, 350, 155, 160),
    "HF 24/23": (_FERRITE, 350, 220, 230),
    "HF 26/26": (_FERRITE, 370, 230, 260),
    "HF 28/28": (_FERRITE, 385, 260, 280),
    "HF 30/26": (_FERRITE, 395, 250, 260),
    "HF 32/25": (_FERRITE, 410, 240, 250),
    "REFeB 210/130": (_NEODYMIUM, 1060, 790, 1300),
    "REFeB 250/120": (_NEODYMIUM, 1130, 840, 1200),
    "REFeB 280/120": (_NEODYMIUM, 1240, 900, 1200),
    "REFeB 320/88": (_NEODYMIUM, 1310, 800, 880),
    "REFeB 360/90": (_NEODYMIUM, 1350, 800, 900),
    "REFeB 63/64p": (_BONDED_NEODYMIUM, 640, 400, 640),
    "RECo5 140/120": (_SAMARIUM_1_5, 860, 600, 1200),
    "RE2Co17 180/100": (_SAMARIUM_2_17, 1000, 680, 1000),
}

_SOURCE = "minimum values of IEC 60404-8-1 as remembered, not read in the standard; temperature coefficient typical"

GRADES: dict[str, Material] = {
    name: Material(
        name, br * 1e-3, hcb * 1e3, hcj * 1e3, family.recoil, family.coefficient, source=_SOURCE, from_memory=True
    )
    for name, (family, br, hcb, hcj) in _MINIMA.items()
}


def lookup(name: str) -> Material:
    """Return the grade of a designation; case and spacing do not matter.

    Raises:
        InputError: No such grade; the message names the nearest ones.
    """
    plain = {_plain(known): known for known in GRADES}
    wanted = _plain(name)
    if wanted in plain:
        return GRADES[plain[wanted]]
    near = [plain[match] for match in get_close_matches(wanted, list(plain), n=3, cutoff=0.5)]
    hint = (
        "did you mean " + " or ".join(f'"{grade}"' for grade in near) + "?"
        if near
        else "known grades are " + ", ".join(f'"{grade}"' for grade in GRADES) + "."
    )
    raise InputError(
        f'must be a known grade, received "{name}"; {hint} Or give the numbers in a material table (remanence_T).'
    )


def remanence_at(material: Material, temperature_C: float) -> float:  # noqa: N803 (a unit, not a word)
    """Return the remanence [T] of ``material`` at a temperature [C], linear about 20 C.

    Raises:
        InputError: The temperature is not 20 C and the material's temperature coefficient is not known.
    """
    if temperature_C == REFERENCE_C:
        return material.remanence
    if material.remanence_temperature_coefficient is None:
        raise InputError(
            f"the remanence at {temperature_C:g} C needs the temperature coefficient of the material, which is not "
            "given; add remanence_percent_per_C to the material table, or set temperature_C = 20"
        )
    return material.remanence * (1.0 + material.remanence_temperature_coefficient * (temperature_C - REFERENCE_C))


def _plain(name: str) -> str:
    return "".join(name.split()).lower()
