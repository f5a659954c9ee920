"""Drawings as SVG, made at the server: the line along its chainage and the canted section."""
