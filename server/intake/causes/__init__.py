"""Causes of death: lists of them, codes placed in a list, and rows by cause read."""
