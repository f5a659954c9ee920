"""What is kept in the database: tables, connection, and the questions asked of it, a module a subject."""
