"""From a plan to words: reasons, findings, methods side by side, and options where nothing fits."""
