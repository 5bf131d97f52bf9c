"""Looking for stacks: encoding, operators, engine and ranking. No physics, no files."""
