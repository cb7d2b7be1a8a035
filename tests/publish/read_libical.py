"""Read iCalendar files with libical, by way of its introspection data: prints {file: [event...]} and counts errors."""

import json
import sys
from typing import Any

import gi

gi.require_version("ICalGLib", "3.0")
from gi.repository import ICalGLib  # noqa: E402

EVENT = ICalGLib.ComponentKind.VEVENT_COMPONENT


def moment(time: Any) -> Any:
    return (time if time.is_date() else time.convert_to_zone(ICalGLib.Timezone.get_utc_timezone())).as_ical_string()


found: dict[str, list[dict[str, Any]]] = {}
for name in sys.argv[1:]:
    with open(name, encoding="utf-8", newline="") as file:
        calendar = ICalGLib.Component.new_from_string(file.read())
    assert calendar is not None, name
    assert calendar.count_errors() == 0, name
    events = found[name] = []
    event = calendar.get_first_component(EVENT)
    while event is not None:
        events.append({
            "uid": event.get_uid(), "starts": moment(event.get_dtstart()), "ends": moment(event.get_dtend()),
            "title": event.get_summary(), "text": event.get_description(),
            "status": event.get_status().value_nick.upper(), "sequence": event.get_sequence(),
        })
        event = calendar.get_next_component(EVENT)
print(json.dumps(found))
