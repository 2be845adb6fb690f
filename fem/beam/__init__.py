"""The beam model: one straight member as a Timoshenko beam with restrained warping.

`solve_beam` is the whole of it. The model is made from the part's declared numbers alone, by itself: outlines
(`outlines`), section properties (`section`), properties along the line (`along`, `cuts`), the differential equations
of the line (`law`, `element`, `equations`), regions, loads and supports (`regions`, `faces`, `actions`), figures
(`figures`, `stress`).
"""

from __future__ import annotations

from fem.beam.result import BeamResult, Cause, Diagram
from fem.beam.solve import solve_beam

__all__ = ["BeamResult", "Cause", "Diagram", "solve_beam"]
