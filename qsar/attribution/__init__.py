"""What each substituent of an acid contributed to its pKa."""

from qsar.attribution.explain import Explained, explain, explain_many
from qsar.attribution.explanation import SITE_STATISTICS, Contribution, Explanation, Witnesses

__all__ = [
    "SITE_STATISTICS",
    "Contribution",
    "Explained",
    "Explanation",
    "Witnesses",
    "explain",
    "explain_many",
]
