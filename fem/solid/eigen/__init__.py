"""Natural frequencies and linear buckling of the solid model."""

from fem.solid.eigen.buckling import solid_buckling
from fem.solid.eigen.modes import Eigenmodes, solid_modes
from fem.solid.eigen.vibration import solid_vibration

__all__ = ["Eigenmodes", "solid_buckling", "solid_modes", "solid_vibration"]
