"""Results as pictures, tables and one page; computes nothing."""
