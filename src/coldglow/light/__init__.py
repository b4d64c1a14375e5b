"""Photons that arrive: line radiance, the glowing shell, Earth's atmosphere; nothing here knows an instrument."""
