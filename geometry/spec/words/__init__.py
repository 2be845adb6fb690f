"""The tables and words of the spec, and messages about them."""
