"""A thin shell: options rendered from core.fields."""
