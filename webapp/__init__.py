"""The web service: pages and API over the same service that the command calls."""
