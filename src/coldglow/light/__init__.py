"""Photons that arrive: line radiance, glowing shell, Earth's atmosphere; nothing here knows an instrument."""
