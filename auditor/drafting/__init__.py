"""A first plant file from a folder of exports, before anything is declared.

What the exports prove is proposed, with the evidence beside it. What they cannot prove stays a blank
that names the choice, and nothing of it is guessed.
"""

from auditor.drafting.proposals import Draft
from auditor.drafting.survey import draft_plant
from auditor.drafting.writing import draft_entries, draft_text

__all__ = ["Draft", "draft_entries", "draft_plant", "draft_text"]
