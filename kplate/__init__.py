"""Thin flat panels from their outline to a judged answer."""
