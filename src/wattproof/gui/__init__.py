"""A thin shell: forms rendered from core.fields. Qt is imported here and nowhere else."""
