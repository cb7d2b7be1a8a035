"""Pages, pictures and feeds: each a pure function of the almanac and of what was published before.

``site`` builds them all; a command that only prints a month needs ``basis`` or ``words`` alone.
"""
