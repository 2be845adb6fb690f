"""From text to numbers."""
