"""Fields that the tables of the spec are made of: quantities as text, each with its kind and range."""

from __future__ import annotations

from dataclasses import dataclass
from typing import Annotated

from pydantic import BaseModel, ConfigDict, Field, Strict

from geometry.spec.text.units import KINDS, Kind


@dataclass(frozen=True, slots=True)
class OfKind:
    """Mark of a field that holds a quantity: its kind, and the range its value must lie in."""

    word: str
    above: float | None = None
    least: float | None = None
    most: float | None = None
    finest: float = 0.0
    """Least size other than 0; smaller ones are slips of a unit, and break geometry kernels."""

    @property
    def kind(self) -> Kind:
        return KINDS[self.word]

    @property
    def range(self) -> str:
        """The range in words, empty when any value may stand."""
        unit = f" {self.kind.unit}" if self.kind.unit else ""
        words = []
        if self.above is not None:
            words.append(f"greater than {self.above:g}{unit if self.above else ''}")
        if self.least is not None:
            words.append(f"at least {self.least:g}{unit if self.least else ''}")
        if self.most is not None:
            words.append(f"at most {self.most:g}{unit}")
        return " and ".join(words)


SIZE = OfKind("length", above=0.0, finest=1e-3)
RADIUS = OfKind("length", least=0.0, finest=1e-3)

Text = Annotated[str, Strict()]
Real = Annotated[float, Strict()]
Length = Annotated[Text, OfKind("length")]
Size = Annotated[Text, SIZE]
Radius = Annotated[Text, RADIUS]
Angle = Annotated[Text, OfKind("angle")]
Force = Annotated[Text, OfKind("force")]
Moment = Annotated[Text, OfKind("moment")]
LineForce = Annotated[Text, OfKind("force per length")]
Acceleration = Annotated[Text, OfKind("acceleration")]
Direction = Annotated[Real | Text, OfKind("number")]
Number = Annotated[Real | Text, OfKind("number")]
Count = Annotated[Annotated[int, Strict()] | Text, OfKind("number", least=1.0, most=1000.0)]
Strength = Annotated[Text, OfKind("stress", above=0.0)]

Point = Annotated[list[Length], Field(min_length=3, max_length=3)]
ForceVector = Annotated[list[Force], Field(min_length=3, max_length=3)]
MomentVector = Annotated[list[Moment], Field(min_length=3, max_length=3)]
LineForceVector = Annotated[list[LineForce], Field(min_length=3, max_length=3)]
AccelerationVector = Annotated[list[Acceleration], Field(min_length=3, max_length=3)]
DirectionVector = Annotated[list[Direction], Field(min_length=3, max_length=3)]


class Words(BaseModel):
    """Base of every table: unknown words are mistakes, and Python may use the field names."""

    model_config = ConfigDict(extra="forbid", populate_by_name=True, hide_input_in_errors=True)
