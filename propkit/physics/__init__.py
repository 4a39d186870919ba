"""Pure functions: SI floats and arrays in and out, numpy and scipy only."""
