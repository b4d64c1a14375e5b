"""What several answers share: inputs, scenarios of a request, one moment, one visit, what is on offer."""
