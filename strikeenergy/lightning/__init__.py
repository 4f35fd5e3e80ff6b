"""The input: what the lightning current is."""
