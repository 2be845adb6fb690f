"""Text of the spec: units, arithmetic, and what is wrong with a file that is not TOML."""
