"""Moonwrit: a community's lunar (Hijri) calendar as a static site and as feeds, every date with its basis."""

__version__ = "0.1.0"
