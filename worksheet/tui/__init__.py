"""The terminal app: screens, dialogs and widgets over a session, and the only home of textual and rich.

It shows values and sends requests; a number computed here would be a second source of it.
"""
