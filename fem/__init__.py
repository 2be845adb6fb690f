"""The physics: two models of one part, which share the parsed `Part` and nothing else.

Knows scikit-fem; knows no files and no command line.

`fem.solid`    tetrahedra and linear elasticity: `solve_solid`
`fem.beam`     Timoshenko members with restrained warping: `solve_beam`
`fem.figure`   the key under which both give a number, so that the judge can join them
"""

from __future__ import annotations

from fem.figure import Figure, FigureKey, station_place

__all__ = ["Figure", "FigureKey", "station_place"]
