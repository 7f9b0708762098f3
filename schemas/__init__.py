"""The contract as Pydantic models: what callers post and what they get."""
