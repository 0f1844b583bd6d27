"""Hosts: pytest and PySpice."""
