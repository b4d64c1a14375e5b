"""Other libraries and the online service; nothing else imports astroplan or astroquery."""
