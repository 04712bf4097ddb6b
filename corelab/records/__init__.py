"""The relational record: schema, engines, history. The only room that knows SQL."""
