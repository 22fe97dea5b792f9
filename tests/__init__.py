"""Tests, in folders that mirror the package; helpers shared between folders are imported as tests.NAME."""
