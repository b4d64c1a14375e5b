"""Electrons and noise: what the opening sees, the spectrum on pixels, counts, information per second."""
