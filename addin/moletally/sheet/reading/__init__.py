"""Table readers: ranges become the records of `chemistry.tables`; every complaint names its cell."""
