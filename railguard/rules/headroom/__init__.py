"""Headroom: whether outputs and inputs stay inside what rails and device allow."""
