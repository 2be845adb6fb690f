"""Section properties: exact integrals of an outline, and finite elements for torsion, shear and warping."""

from __future__ import annotations

from fem.beam.section.compute import (
    is_open_thin,
    largest_torsion_stress,
    mesh_size,
    properties_on_mesh,
    section_properties,
    sections_properties,
)
from fem.beam.section.integrals import OutlineIntegrals, outline_integrals
from fem.beam.section.points import shear_stress_at, warping_at
from fem.beam.section.properties import SectionProperties
from fem.beam.section.saint_venant import SaintVenant, saint_venant

__all__ = [
    "OutlineIntegrals",
    "SaintVenant",
    "SectionProperties",
    "is_open_thin",
    "largest_torsion_stress",
    "mesh_size",
    "outline_integrals",
    "properties_on_mesh",
    "saint_venant",
    "section_properties",
    "sections_properties",
    "shear_stress_at",
    "warping_at",
]
