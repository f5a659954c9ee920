"""The migrations, one file a step."""
