"""What a policy asks, in the words of a language: its conditions, where they must hold, and by when."""

from __future__ import annotations

from collections.abc import Iterable

from moonwrit.policy import Method
from moonwrit.policy.conditions import Condition, Every, Scoped
from moonwrit.policy.scopes import MAX_LATITUDE_DEG, Anywhere, AtPlaces, Before, Scope, Within
from moonwrit.publish import labels, words
from moonwrit.publish.language import Language
from moonwrit.sky.comparison import All, Any, Comparison, Rule, clock


def asked_in_words(method: Method, language: Language) -> str:
    """What is asked, period by period."""
    _ = language.gettext
    if method.tabular is not None:
        return _("arithmetic: %(pattern)s") % {"pattern": method.tabular.name}
    if method.table is not None:
        return _("a table of month starts")
    if method.adopts:
        titles = language.listing([language.name(each.title) for each in method.adopts])
        return _("the first to begin a month of: %(authorities)s") % {"authorities": titles}
    if len(method.eras) == 1:
        return _condition(method.eras[0].condition, language)
    return _("; ").join(
        _("from %(year)s AH on, %(asked)s") % {
            "year": language.digits(era.first // 12 + 1), "asked": _condition(era.condition, language),
        }
        for era in method.eras
    )


def _condition(condition: Condition, language: Language) -> str:
    _ = language.gettext
    if isinstance(condition, Scoped):
        return _("%(test)s, %(where)s") % {
            "test": _rule(condition.rule, language), "where": _scope(condition.scope, language),
        }
    parts = _("; ").join(f"({_condition(part, language)})" for part in condition.parts)
    text = _("all of: %(parts)s") if isinstance(condition, Every) else _("one of: %(parts)s")
    return text % {"parts": parts}


def _rule(rule: Rule, language: Language) -> str:
    _ = language.gettext
    if isinstance(rule, Comparison):
        limit = words.measured(rule.threshold, rule.quantity.unit, language)
        return _("%(quantity)s (%(frame)s) %(asked)s") % {
            "quantity": words.quantity(rule.quantity.name, language),
            "frame": words.frame(rule.quantity.frame, language),
            "asked": _(labels.SIGNS[rule.sign]) % {"limit": limit},
        }
    other = Any if isinstance(rule, All) else All
    return _joined(
        (f"({_rule(part, language)})" if isinstance(part, other) else _rule(part, language) for part in rule.parts),
        _("%(one)s and %(other)s") if isinstance(rule, All) else _("%(one)s or %(other)s"),
    )


def _joined(parts: Iterable[str], pattern: str) -> str:
    first, *rest = parts
    for part in rest:
        first = pattern % {"one": first, "other": part}
    return first


def _scope(scope: Scope, language: Language) -> str:
    _ = language.gettext
    match scope:
        case AtPlaces():
            return _places(scope, language)
        case Anywhere():
            latitude = {"degrees": language.number(MAX_LATITUDE_DEG)}
            if scope.before is None:
                return _("anywhere on Earth between %(degrees)s° south and north") % latitude
            return _("anywhere on Earth between %(degrees)s° south and north, %(deadline)s") % {
                **latitude, "deadline": _before(scope.before, language),
            }
        case Within() if scope.needed > 0:
            return _("over at least %(share)s per cent of the area of the outline") % {
                "share": language.number(100 * scope.needed, 1)}
        case Within():
            return _("anywhere inside the outline")
        case _:
            return str(scope)


def _places(scope: AtPlaces, language: Language) -> str:
    _ = language.gettext
    names = {"places": language.listing([language.name(name) for name in scope.names])}
    if len(scope.names) == 1:
        where = _("at %(places)s") % names
    elif scope.needed == 0:
        where = _("at any of %(places)s") % names
    elif scope.needed == 1:
        where = _("at every one of %(places)s") % names
    else:
        where = _("at no fewer than %(share)s per cent of %(places)s") % {
            **names, "share": language.number(100 * scope.needed, 1)}
    if scope.fallback is None:
        return where
    fallback = language.listing([language.name(name) for name in dict.fromkeys(scope.fallback_names)])
    return _("%(where)s (where the Sun does not set: %(fallback)s)") % {"where": where, "fallback": fallback}


def _before(before: Before, language: Language) -> str:
    _ = language.gettext
    if before.hour_ut is not None:
        return _("before %(time)s UT of the date") % {"time": language.digits(clock(before.hour_ut))}
    return _("before the dawn there (Sun %(degrees)s° below the horizon)") % {
        "degrees": language.number(before.depression_deg)}


__all__ = ["asked_in_words"]
