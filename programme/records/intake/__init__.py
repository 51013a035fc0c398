"""Files on their way in: read, matched by meaning, shown row by row, then stored all or none."""
