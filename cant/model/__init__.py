"""What things are: the tables that go in and the records that come out. Imports nothing above itself."""
