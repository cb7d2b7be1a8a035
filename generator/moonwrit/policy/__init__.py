"""Policies: from circumstances of the sky to month starts with their reasons."""

from moonwrit.policy.months import FIXED, Basis, Closeness, Evidence, Finding, Margin, Month, Standing

__all__ = ["FIXED", "Basis", "Closeness", "Evidence", "Finding", "Margin", "Month", "Standing"]
