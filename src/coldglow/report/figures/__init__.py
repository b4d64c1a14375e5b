"""Figures: one function per figure, arrays in display units in, a matplotlib Figure out."""
