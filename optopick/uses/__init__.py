"""One module for each use: pick, check."""
