"""Dialogs: small screens over a screen that hand back one answer; none of them knows what it is for."""
