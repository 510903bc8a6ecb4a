"""What people who handle strong magnets must be told; the one source of these texts for reports and exported files."""

from __future__ import annotations

IDEAL = (
    "IDEAL: all numbers are for sharp edges between poles, magnetized through the full thickness, with rigid "
    "magnetization (recoil permeability 1). A real magnetizer blurs the edges over a transition width and may not "
    "reach the full depth, which weakens fine poles most; measure a first sample before relying on tight margins."
)

GUIDE = (
    "Stable only on a guide: a stand-off between permanent magnets holds along the axis alone and is always unstable "
    "in some other direction (Earnshaw). Provide a pin, rail or hinge that takes the sideways force and the tilt."
)

FRAME = (
    "Patterns are stored in the base's frame as seen from +z, looking down on the base's mating face: x to the right, "
    "y up, first line lowest y. The value 1 is magnetized along +z: it shows N on the base's mating face and S on the "
    "mover's; -1 the reverse; 0 is unmagnetized or off the blank."
)

CAUTIONS: tuple[tuple[str, str], ...] = (
    (
        "Pinching",
        "Parts jump together over a distance and turn or shift sideways while they do. Keep fingers out of the gap, "
        "handle one part at a time, and assemble with a non-magnetic tool or a guide.",
    ),
    (
        "Shattering",
        "Sintered magnets are brittle and throw sharp chips when they collide. Wear eye protection, never let parts "
        "snap together, and do not machine them: the dust burns.",
    ),
    (
        "Implants",
        "Pacemakers, defibrillators and other active implants may be disturbed above about 0.5 mT. The 0.5 mT line of "
        "the stray-field maps shows how near that is; mark the place and keep people with implants outside it.",
    ),
    (
        "Cards, watches, instruments",
        "Magnetic stripes of the weaker kind are written at about 30 mT and are spoilt by less over time; mechanical "
        "watches, compasses, hearing aids, storage disks and sensors are disturbed by far smaller fields. Keep them "
        "away.",
    ),
    (
        "Transport",
        "By air, a package is forbidden above 0.525 uT (0.00525 gauss) at 4.5 m from any of its surfaces (49 CFR "
        "173.21(d)), and magnetized material (UN 2807) is subject to the carriers' packing instruction 953. Pack "
        "parts mated, in pairs or with a keeper, measure the finished package, and ask the carrier: rules change.",
    ),
    (
        "Heat",
        "Heat weakens every grade, above its limit for good; ferrite is also weakened for good by cold. The results "
        "hold at the temperature of the spec.",
    ),
)

DEFER = (
    "These notes are no safety assessment. Local codes and rules, and the judgement of a licensed or otherwise "
    "competent practitioner, come before anything said here."
)


def caution_lines() -> list[str]:
    """Return the cautions as plain lines, each with its heading."""
    return [*(f"{heading}: {text}" for heading, text in CAUTIONS), DEFER]
