"""Law as data: what a jurisdiction requires, read from one file, each value with its source."""
