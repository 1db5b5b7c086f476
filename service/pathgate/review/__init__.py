"""From a model config to findings: what its shape must be, what it claims, what is wrong with the claim."""
