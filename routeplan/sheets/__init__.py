"""What goes out: one catalogue of tables, and the sheets made from it."""
