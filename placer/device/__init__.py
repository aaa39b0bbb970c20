"""Say what the hardware is."""
