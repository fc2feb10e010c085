"""From raw data to a phased, flat, referenced spectrum, by a stored recipe."""
