"""The pages, a blueprint a concern: each view parses its request, calls one function, shows one result."""
