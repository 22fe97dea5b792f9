"""Tests of hand-offs: pages read back, held against the documents, opened in a browser, and shown hostile text."""
