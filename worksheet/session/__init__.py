"""Everything a user can do, once, for both front ends: edits with their inverses, snapshots, saving.

A front end shows a frozen snapshot and sends requests; it never changes a sheet by itself.
"""
