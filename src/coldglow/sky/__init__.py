"""Where things are: a time grid in, place, orientation and observability out."""
