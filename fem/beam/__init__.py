"""The beam model: one straight member as a Timoshenko beam with restrained warping.

`solve_beam` is the whole of it. The model is made from the part's declared numbers alone, by itself: outlines
(`outlines`), section properties (`section`), properties along the line (`along`, `cuts`), the differential equations
of the line (`law`, `element`, `equations`), regions, loads and supports (`regions`, `faces`, `actions`, `strip_load`),
all cases at once (`cases`), figures (`figures`, `stress`, `notches`), natural frequencies and linear buckling
(`modes`), and predicted differences from a solid (`causes`).

Restrained warping acts where a section is open and thin; it is stopped at an end face that is held along x point by
point, or that moves as a rigid body. A rigid coupling, of a support or a load, stiffens its region in *every* case.
Section forces are about the declared line, wherever the section lies to it.
"""

from __future__ import annotations

from fem.beam.result import BeamResult, Cause, Diagram
from fem.beam.solve import solve_beam

__all__ = ["BeamResult", "Cause", "Diagram", "solve_beam"]
