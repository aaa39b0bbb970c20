"""Say what is asked."""
