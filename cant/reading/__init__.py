"""From a grid of values to tables: headings, units, notation, and every doubt on the way."""
