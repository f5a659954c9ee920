"""Limit sets that come with the program, as data, and the loader that makes them into models."""
