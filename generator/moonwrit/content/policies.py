"""Policies as a community writes them down: a test, where it must hold, and what happens otherwise."""

from __future__ import annotations

from datetime import date
from typing import Literal

from pydantic import model_validator

from moonwrit.content.models import Identifier, Text, Words, _Model


class Arithmetic(_Model):
    """A tabular calendar: an intercalation pattern of thirty years and its epoch."""

    pattern: Literal["15", "16", "fatimid", "habash"] = "16"
    epoch: Literal["civil", "thursday"] = "civil"


class Criterion(_Model):
    """A published criterion by its usual name, with the classes or zones that are accepted."""

    criterion: Identifier
    accept: list[Text] | None = None


class Where(_Model):
    """Where the test must hold: at one named place."""

    place: Identifier


class Policy(_Model):
    """What a community has adopted. Exactly one of ``published``, ``arithmetic`` and ``test``.

    ``decided_by: record`` means that months stay *expected* until a decision is recorded;
    ``decided_by: calculation`` means that the computed date is the community's date (*settled*).
    """

    name: Words
    summary: Words | None = None
    source: Words | None = None
    adopted: date | None = None
    decided_by: Literal["record", "calculation"]
    published: Identifier | None = None
    arithmetic: Arithmetic | None = None
    test: Criterion | None = None
    where: Where | None = None

    @model_validator(mode="after")
    def _one_kind(self) -> Policy:
        kinds = [k for k in ("published", "arithmetic", "test") if getattr(self, k) is not None]
        if len(kinds) != 1:
            raise ValueError("say exactly one of published, arithmetic and test")
        if (self.test is None) != (self.where is None) and self.published is None:
            raise ValueError("test and where go together; say what must hold and where")
        return self
