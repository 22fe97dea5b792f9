"""Pages: rows made from a snapshot and its results, without a screen; what a page says is tested here."""
