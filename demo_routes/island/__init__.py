"""The invented island Ostrellan: its ground, its ways and what is planned on it."""
