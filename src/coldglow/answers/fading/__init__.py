"""Behind `fade`: the best night of each year, the forecast, its words."""
