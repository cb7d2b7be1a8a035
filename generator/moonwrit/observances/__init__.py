"""Observance rules turned into dated occurrences."""

from moonwrit.observances.dated import Occurrence, occurrences

__all__ = ["Occurrence", "occurrences"]
