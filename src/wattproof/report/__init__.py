"""A Session as page, document, table, picture. Never imports the store."""
