"""Judging: verdicts of intervals and periods, and the findings that need the whole picture.

Codes and numbers only; every word a person reads is made by the report.
"""

from __future__ import annotations

from auditor.judging.judge import Judged, JudgingSettings, judge
from auditor.judging.verdicts import judge_machine

__all__ = ["Judged", "JudgingSettings", "judge", "judge_machine"]
