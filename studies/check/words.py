"""The words that a judgement takes."""

from __future__ import annotations

from typing import Literal

JudgementWord = Literal["agrees", "explained", "suspicious", "load check", "no beam value"]
LimitWord = Literal["met", "missed", "not established"]
