"""A bar solved by both models on a structured mesh: no CAD, no mesher, only the two models and the judge."""

import sys
from pathlib import Path

sys.path.insert(0, str(Path(__file__).parent.parent / "solid_model"))
sys.path.insert(0, str(Path(__file__).parent))
