"""What the user wrote: target, instrument and request, from YAML to frozen SI records."""
