"""The catalogue: what each quantity is called, its unit and the keys a spec may give it.

Plain data: the spec is validated against it without loading any physics. The classes that compute the quantities
stand in the families (``axial``, ``lateral``, ``leakage``, ``making``) and are joined to these entries by
``registry``.
"""

from __future__ import annotations

from dataclasses import dataclass
from typing import Any, Literal

KeyKind = Literal["number", "numbers", "range", "pair", "pairs", "point", "points", "choice"]


@dataclass(frozen=True)
class Key:
    """One key of a spec entry.

    Attributes:
        name: As written in the spec, with its unit ("gap_mm").
        kind: "number"; "numbers" (one or a list); "range" (two rising numbers); "pair" ([x, y]); "pairs" (one pair or a
            list of pairs); "point" ([x, y, z]); "points" (one point or a list); "choice".
        unit: The unit of its numbers, see ``models.units``.
        required: Must it be given?
        default: Value when it is not given.
        choices: The words allowed for a "choice".
        minimum: Least value allowed, or None.
        positive: Must its numbers be larger than zero?
        help: One sentence for the schema and the docs.
    """

    name: str
    kind: KeyKind
    unit: str = "1"
    required: bool = True
    default: Any = None
    choices: tuple[str, ...] = ()
    minimum: float | None = None
    positive: bool = False
    help: str = ""


@dataclass(frozen=True)
class Info:
    """One line of the catalogue.

    Attributes:
        name: Name of the quantity.
        unit: The unit of its value in specs, tables and reports.
        meaning: One sentence: what it is, its sign.
        cheat: How an optimizer could satisfy the number without the behaviour, and what guards against it.
        keys: The keys it takes besides ``quantity`` and the bound.
        better: "higher" or "lower" when one direction is what people usually want, "either" otherwise.
    """

    name: str
    unit: str
    meaning: str
    cheat: str
    keys: tuple[Key, ...]
    better: Literal["higher", "lower", "either"] = "either"


GAP = Key("gap_mm", "number", "mm", minimum=0.0, help="Gap between the coated mating faces.")
GAPS = Key("gap_mm", "numbers", "mm", minimum=0.0, help="Gap between the coated mating faces, one or a list.")
OFFSET = Key("offset_mm", "pair", "mm", required=False, default=(0.0, 0.0), help="Lateral offset [x, y] of the mover.")
OFFSETS = Key(
    "offset_mm", "pairs", "mm", required=False, default=(0.0, 0.0),
    help="Lateral offset [x, y] of the mover, one or a list.",
)  # fmt: skip
BETWEEN = Key("between_mm", "range", "mm", minimum=0.0, help="Range of gaps [from, to].")
PART = Key(
    "of", "choice", choices=("base", "mover", "both"), required=False, default="both",
    help="Which part; of both, the worse one counts.",
)  # fmt: skip
SOURCE = Key(
    "of", "choice", choices=("base", "mover", "pair"), required=False, default="pair", help="A part alone, or the pair."
)
PAIR_GAP = Key("gap_mm", "number", "mm", required=False, minimum=0.0, help='Gap of the pair; needed when of = "pair".')
AXIS = Key("axis", "choice", choices=("x", "y"), required=False, default="x", help="Direction of the slide.")

_ENTRIES = (
    Info(
        "axial_force",
        "N",
        "Axial force F_z on the mover; positive pushes the parts apart.",
        "Meets the listed gaps and misbehaves between them: list enough gaps, read the curve in the report.",
        (GAPS, OFFSETS),
    ),
    Info(
        "holding_force",
        "N",
        "Minus the axial force: positive holds the parts together.",
        "As axial_force; a hold at one gap says nothing of the next.",
        (GAPS, OFFSETS),
        "higher",
    ),
    Info(
        "slide_force",
        "N",
        "Largest lateral force needed to slide the mover along an axis: restoring force plus friction times hold.",
        "One steep spot at a small offset counts as much as a long resistance; the travel bounds where it may be.",
        (
            GAP,
            Key("travel_mm", "number", "mm", positive=True, help="Largest offset looked at."),
            AXIS,
            Key("friction", "number", required=False, default=0.0, minimum=0.0, help="Coefficient of friction."),
        ),
        "higher",
    ),
    Info(
        "peel_force",
        "N",
        "Force at an arm that peels the mover off over an edge: (hold * c + closing moment) / arm.",
        "Poles crowded at the far edge raise it without raising the hold.",
        (
            GAP,
            Key("arm_mm", "number", "mm", positive=True, help="Lever arm from the pivot edge."),
            Key(
                "edge",
                "choice",
                choices=("-x", "+x", "-y", "+y"),
                required=False,
                default="-x",
                help='Pivot edge of the mover: "-x" is the edge at lowest x.',
            ),
        ),
        "higher",
    ),
    Info(
        "opening_work",
        "mJ",
        "Work to pull the parts apart: the positive part of the hold integrated over a range of gaps.",
        "Parts that repel further out are not credited for it: only the positive part counts.",
        (BETWEEN,),
        "higher",
    ),
    Info(
        "stand_off",
        "mm",
        "Gap of stable axial equilibrium under a load inside a range (the innermost); stable only on a guide.",
        "A vanishing slope also crosses zero: ask for axial_stiffness as well.",
        (
            Key("load_N", "number", "N", required=False, default=0.0, help="Load that presses the mover down."),
            BETWEEN,
        ),
    ),
    Info(
        "axial_stiffness",
        "N/mm",
        "-dF_z/dgap: positive resists a change of the gap about an equilibrium.",
        "Stiffness without an equilibrium holds nothing: ask for the force too.",
        (GAP, OFFSET),
        "higher",
    ),
    Info(
        "peak_force",
        "N",
        "Largest repulsion or attraction over a range of gaps (its size, positive).",
        "A narrow peak anywhere in the range counts; bound the range.",
        (
            Key("which", "choice", choices=("repulsion", "attraction"), help="Which sign of the force."),
            BETWEEN,
        ),
        "either",
    ),
    Info(
        "force_sensitivity",
        "%/mm",
        "100 (dF_z/dgap)/F_z: relative change of the force with the gap.",
        "A large force far from zero lowers it; a zero of the force makes it meaningless.",
        (GAP, OFFSET),
    ),
    Info(
        "lateral_force",
        "N",
        "Restoring force along the offset: positive pulls the mover back to the centre.",
        "Only the listed offsets count; slide_force looks at a whole travel.",
        (GAP, Key("offset_mm", "pairs", "mm", help="Lateral offset [x, y] of the mover, one or a list.")),
        "higher",
    ),
    Info(
        "lateral_stiffness",
        "N/mm",
        "Least eigenvalue of -d(F_x, F_y)/d(x, y): positive is self-centring.",
        "It is local: lateral_force tells how far the centring reaches.",
        (GAP,),
        "higher",
    ),
    Info(
        "tilt_moment",
        "N mm",
        "Size of the moment on the mover about the centre of its mating face, axes in the face.",
        "Zero moment at one gap may hide a moment at another.",
        (GAP, OFFSET),
        "lower",
    ),
    Info(
        "stray_field",
        "mT",
        "Peak of |B| outside: on a plane behind or before the part, or everywhere at a distance around it.",
        "A peak between probe points: the reported peak is refined, never the raster's.",
        (
            SOURCE,
            Key("side", "choice", choices=("back", "front", "around"), help="Where the field is looked at."),
            Key("distance_mm", "number", "mm", positive=True, help="Distance from the outer surface."),
            PAIR_GAP,
        ),
        "lower",
    ),
    Info(
        "field_at",
        "mT",
        "A component of B, or its size, at points in the base's frame.",
        "Only the listed points count; stray_field looks at a whole surface.",
        (
            SOURCE,
            Key("point_mm", "points", "mm", help="Point [x, y, z] in the base's frame, one or a list."),
            Key("component", "choice", choices=("x", "y", "z", "size"), required=False, default="size"),
            PAIR_GAP,
        ),
    ),
    Info(
        "field_reach",
        "mm",
        "Least distance from the surface beyond which B stays under a level everywhere around.",
        "None known: |B| on surfaces further out cannot exceed its peak on a nearer one.",
        (
            SOURCE,
            Key("field_mT", "number", "mT", required=False, default=0.5, positive=True, help="The level."),
            PAIR_GAP,
        ),
        "lower",
    ),
    Info(
        "net_moment",
        "A m2",
        "Size of the dipole moment of a part.",
        "Zero moment still leaves quadrupole leakage: stray_field counts that too.",
        (PART,),
        "lower",
    ),
    Info(
        "pole_count",
        "1",
        "Connected poles on a part (cells that share an edge).",
        "Poles joined by a thread count as one: narrowest_pole forbids threads.",
        (PART,),
        "lower",
    ),
    Info(
        "pole_edge_length",
        "mm",
        "Total boundary between N and S on a part: a proxy for magnetizing effort.",
        "A uniform face has none: ask for the behaviour as well.",
        (PART,),
        "lower",
    ),
    Info(
        "narrowest_pole",
        "mm",
        "Smallest pole width on a part: the widest square brush that paints every pole without loss.",
        "Exact on the rounded pattern, so a relaxed pattern cannot cheat it.",
        (PART,),
        "higher",
    ),
)

CATALOGUE: dict[str, Info] = {entry.name: entry for entry in _ENTRIES}
