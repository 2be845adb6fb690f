"""What the shop can make: least wall, radius of the tool, distance of holes from edges, for one resolved part.

A variant that breaks a rule is left out of the study, with the rule and the place. Sections are looked at at both ends
of every stretch: between stations dimensions vary linearly, so nothing is thinner in between.
"""

from studies.vary.plan.shop.rules import Shop, read_shop

__all__ = ["Shop", "read_shop"]
