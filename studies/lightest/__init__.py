"""The lightest variant under the limits, with far fewer solves than a grid.

`search` works on any `Evaluator`; `studies.lightest.study.lightest` is the same on a plan, every solve in a record.
"""

from studies.lightest.evaluator import Evaluator, Solved
from studies.lightest.search import Found, search
from studies.lightest.space import Dimension, Space

__all__ = ["Dimension", "Evaluator", "Found", "Solved", "Space", "search"]
