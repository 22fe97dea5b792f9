"""Revisions of a project in git: the only layer that starts the git program.

Kept apart so that what is run, with which environment and which settings, can be read in one place;
without git everything but revisions works.
"""
