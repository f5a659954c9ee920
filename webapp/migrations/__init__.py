"""Migrations of the database, applied at start."""
