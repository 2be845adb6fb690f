"""The judge: pairs the two models' figures and says which agree, which differ for a stated reason, which not."""

from __future__ import annotations

from studies.judge.whole_run import Judgement, judge

__all__ = ["Judgement", "judge"]
