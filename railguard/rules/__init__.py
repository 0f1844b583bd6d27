"""Judgement: one family each, the rule's signature, the registry, waivers."""
