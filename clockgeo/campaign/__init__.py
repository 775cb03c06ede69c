"""The campaign document, from reading and checking to results."""
