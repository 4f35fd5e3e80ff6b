"""How results are shown: text, JSON, CSV."""
