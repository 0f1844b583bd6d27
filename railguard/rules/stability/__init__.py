"""Stability: noise gain, phase margin, capacitive load, transimpedance stages."""
