"""Write what people and other tools read."""
