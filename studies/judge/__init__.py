"""The judge: pairs the two models' figures and says which agree, which differ for a stated reason, which not."""

from __future__ import annotations

from studies.judge.judge import Judgement, judge

__all__ = ["Judgement", "judge"]
