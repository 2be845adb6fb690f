"""What a person reads of a run: pictures (PNG) and the summary (Markdown).

The pictures are drawn with NumPy and matplotlib alone, by an own depth-buffered renderer: a fresh headless
machine has no graphics libraries, and off-screen windows are where such tools fail first.
"""
