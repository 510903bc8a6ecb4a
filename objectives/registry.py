"""Which class computes which entry of the catalogue."""

from __future__ import annotations

from . import axial, lateral, leakage, making
from .quantity import Quantity

QUANTITIES: dict[str, type[Quantity]] = {
    "axial_force": axial.AxialForce,
    "holding_force": axial.HoldingForce,
    "slide_force": lateral.SlideForce,
    "peel_force": axial.PeelForce,
    "opening_work": axial.OpeningWork,
    "stand_off": axial.StandOff,
    "axial_stiffness": axial.AxialStiffness,
    "peak_force": axial.PeakForce,
    "force_sensitivity": axial.ForceSensitivity,
    "lateral_force": lateral.LateralForce,
    "lateral_stiffness": lateral.LateralStiffness,
    "tilt_moment": lateral.TiltMoment,
    "stray_field": leakage.StrayField,
    "field_at": leakage.FieldAt,
    "field_reach": leakage.FieldReach,
    "net_moment": leakage.NetMoment,
    "pole_count": making.PoleCount,
    "pole_edge_length": making.PoleEdgeLength,
    "narrowest_pole": making.NarrowestPole,
}
