"""Checks that need values or more than one field, and the plain geometry that they are judged by."""
