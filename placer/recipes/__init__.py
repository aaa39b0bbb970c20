"""Say how a call can be built."""
