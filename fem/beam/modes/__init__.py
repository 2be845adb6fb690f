"""Natural frequencies and linear buckling of the beam model."""

from __future__ import annotations

from fem.beam.modes.buckling import beam_buckling, buckling_studies
from fem.beam.modes.vibration import beam_vibration

__all__ = ["beam_buckling", "beam_vibration", "buckling_studies"]
