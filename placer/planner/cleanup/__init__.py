"""When values are computed and cleaned up: reversible pebbling with real costs."""
