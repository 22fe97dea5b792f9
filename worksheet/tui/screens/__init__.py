"""Screens: one a module; each shows a page, moves its cursor, and hands what the user asks for to the session."""
