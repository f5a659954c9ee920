"""Sets the cant of railway curves for mixed traffic."""
